package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem/survey"
	"tarnlight/unmix/report"
)

// result is what a verb left behind.
type result struct {
	code     int
	out, err string
}

// call runs the program in process.
func call(args ...string) result {
	var out, errs bytes.Buffer
	code := run(context.Background(), streams{in: strings.NewReader(""), out: &out, err: &errs}, args)
	return result{code, out.String(), errs.String()}
}

// want fails unless the exit code is one of codes.
func (r result) want(t *testing.T, codes ...int) result {
	t.Helper()
	for _, c := range codes {
		if r.code == c {
			return r
		}
	}
	t.Fatalf("exit %d, want %v\nstdout:\n%s\nstderr:\n%s", r.code, codes, r.out, r.err)
	return r
}

// folder makes a survey folder of files (name → content).
func folder(t testing.TB, files map[string]string) string {
	t.Helper()
	dir := t.TempDir()
	for name, content := range files {
		put(t, dir, name, content)
	}
	return dir
}

func put(t testing.TB, dir, name, content string) {
	t.Helper()
	p := filepath.Join(dir, filepath.FromSlash(name))
	if err := os.MkdirAll(filepath.Dir(p), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(p, []byte(content), 0o644); err != nil {
		t.Fatal(err)
	}
}

func read(t testing.TB, path ...string) string {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(path...))
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// table reads a results table.
func table(t testing.TB, path ...string) *report.Table {
	t.Helper()
	tab, err := report.ReadTable(filepath.Join(path...))
	if err != nil {
		t.Fatal(err)
	}
	return tab
}

// cell is a value of the row in which every named column has its text.
func cell(t testing.TB, tab *report.Table, column string, where ...string) string {
	t.Helper()
	for _, row := range tab.Rows {
		ok := true
		for i := 0; i < len(where); i += 2 {
			ok = ok && row[tab.Col(where[i])] == where[i+1]
		}
		if ok {
			return row[tab.Col(column)]
		}
	}
	t.Fatalf("%s has no row with %v", tab.Name, where)
	return ""
}

func number(t testing.TB, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatalf("%q is not a number", s)
	}
	return v
}

// tiny is a survey of a few bottles on a coarse grid: two components a and b with
// standards, two samples and a blank, in counts. Cells are ex × em.
type tiny struct {
	sheet    []string
	settings string
	files    map[string]string
}

func newTiny() *tiny {
	y := &tiny{files: map[string]string{}, settings: `
[correct]
inner_filter = "none"
[intensity]
unit = "counts"
[scatter]
rayleigh.first = "off"
rayleigh.second = "off"
raman.first = "off"
raman.second = "off"
`}
	y.sheet = []string{"id,kind,scans,measured,dilution,conc:a [mg/L],conc:b [mg/L]"}
	y.add("B1", "blank", 0, 0, "")
	y.add("A1", "standard", 1, 0, "1,")
	y.add("A2", "standard", 2, 0, "2,")
	y.add("BB1", "standard", 0, 2, ",2")
	y.add("W1", "sample", 1.5, 0.5, "")
	y.add("W2", "sample", 0.4, 1.1, "")
	return y
}

// grid holds the two spectra of tiny and its wavelengths.
var (
	tinyEx = []float64{250, 260, 270}
	tinyEm = []float64{300, 310, 320, 330, 340}
)

func tinyCell(a, b float64, j, k int) float64 {
	ea, eb := []float64{1, .6, .2}, []float64{.3, .8, 1}
	ma, mb := []float64{.4, 1, .7, .3, .1}, []float64{.1, .2, .5, 1, .6}
	ripple := 0.5 * float64((j*7+k*3)%5-2) // what a detector adds
	return 10 + 1000*(a*ea[j]*ma[k]+0.5*b*eb[j]*mb[k]) + ripple
}

// add appends a bottle with amounts a and b; conc are the last two cells.
func (y *tiny) add(id, kind string, a, b float64, conc string) {
	if conc == "" {
		conc = ","
	}
	y.sheet = append(y.sheet, fmt.Sprintf("%s,%s,scans/%s.csv,2031-05-03,,%s", id, kind, id, conc))
	y.files["scans/"+id+".csv"] = gridText(a, b)
}

func gridText(a, b float64) string {
	var s strings.Builder
	s.WriteString("em_nm\\ex_nm")
	for _, ex := range tinyEx {
		fmt.Fprintf(&s, ",%g", ex)
	}
	s.WriteString("\n")
	for k, em := range tinyEm {
		fmt.Fprintf(&s, "%g", em)
		for j := range tinyEx {
			fmt.Fprintf(&s, ",%.4f", tinyCell(a, b, j, k))
		}
		s.WriteString("\n")
	}
	return s.String()
}

// write makes the folder.
func (y *tiny) write(t testing.TB) string {
	dir := folder(t, y.files)
	put(t, dir, "runsheet.csv", strings.Join(y.sheet, "\n")+"\n")
	put(t, dir, "survey.toml", y.settings)
	return dir
}

func readSheet(t testing.TB, path string) *survey.Sheet {
	t.Helper()
	s, err := survey.ParseSheet(path, []byte(read(t, path)), survey.Default())
	if err != nil {
		t.Fatal(err)
	}
	return s
}
