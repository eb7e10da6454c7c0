package report

import (
	"archive/zip"
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/csv"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"
)

// rendered makes a report of n bottles and returns its folder.
func rendered(t testing.TB, n int, change func(*RenderSettings), methods ...string) string {
	t.Helper()
	dir := t.TempDir()
	newFixture(t, n, methods...).write(t, dir)
	s := testSettings()
	if change != nil {
		change(&s)
	}
	must(t, Render(context.Background(), dir, s, nil))
	return dir
}

// Every number in the workbook, read back, is the one in contributions.csv: to
// 1e-14, because the library writes 15 digits.
func TestWorkbookEqualsContributions(t *testing.T) {
	dir := rendered(t, 24, func(s *RenderSettings) { s.Pictures = false }, "references", "parafac")
	f, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer f.Close()
	rows, err := f.GetRows("Results", excelize.Options{RawCellValue: true})
	must(t, err)
	shown, err := f.GetRows("Results")
	must(t, err)
	head := rows[3]
	at := map[string]int{}
	for i, h := range head {
		at[h] = i
	}
	byID := map[string][2][]string{}
	for i, r := range rows[4:] {
		byID[r[0]] = [2][]string{r, shown[4+i]}
	}
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	checked := map[string]int{}
	for i := range c.Rows {
		text := func(name string) string { return c.Text(i, c.Col(name)) }
		pair, ok := byID[visible(text("id"))]
		if !ok {
			t.Fatalf("no row of %q", text("id"))
		}
		n := -1
		for k, h := range head {
			label := text("component") + " (" + methodName(text("method")) + "), RU"
			if text("method") == "unexplained" {
				label = "not explained, RU"
			}
			if strings.HasSuffix(h, label) {
				n = k
			}
		}
		raw, seen := pair[0], pair[1]
		get := func(k int) float64 {
			if k >= len(raw) || raw[k] == "" {
				return math.NaN()
			}
			v, err := strconv.ParseFloat(raw[k], 64)
			must(t, err)
			return v
		}
		same := func(what string, got, want float64) {
			if math.Abs(got-want) > 1e-14*math.Abs(want) || math.IsNaN(got) {
				t.Errorf("%s %s %s: %s is %g, want %g", text("id"), text("component"), text("method"), what, got, want)
			}
		}
		q := text("qualifier")
		checked[q]++
		switch q {
		case "R":
			if raw[n] != text("reported") {
				t.Errorf("%s: %q instead of %q", text("id"), raw[n], text("reported"))
			}
		case "U":
			same("detection limit", get(n), c.Float(i, c.Col("detection_limit")))
			if seen[n] != text("reported") {
				t.Errorf("%s: shown as %q, reported is %q", text("id"), seen[n], text("reported"))
			}
		default:
			same("value", get(n), c.Float(i, c.Col("value")))
			same("±", get(n+1), 2*c.Float(i, c.Col("standard_uncertainty")))
			if seen[n] != text("reported") {
				t.Errorf("%s: shown as %q, reported is %q", text("id"), seen[n], text("reported"))
			}
		}
		if n+2 < len(raw) && raw[n+2] != q {
			t.Errorf("%s: qualifier %q, want %q", text("id"), raw[n+2], q)
		}
	}
	if checked["R"] == 0 || checked["U"] == 0 || checked["J"] == 0 || checked[""] == 0 {
		t.Errorf("the survey lacks a kind of result: %v", checked)
	}
}

// What makes the workbook fit to hand over survives the writing.
func TestReportedFormat(t *testing.T) {
	for text, want := range map[string]string{"0.371": "0.000", "< 0.013": "0.000", "12": "0", "9.1e-5": "0.0E+0", "< 9.1e-5": "0.0E+0", "not usable": "0.00"} {
		if got := reportedFormat(text, 1.5); got != want {
			t.Errorf("%q: %s, want %s", text, got, want)
		}
	}
}

func TestWorkbookIsFitted(t *testing.T) {
	dir := rendered(t, 12, func(s *RenderSettings) { s.Pictures = false; s.Title = "A & B" }, "parafac")
	f, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer f.Close()
	if got := strings.Join(f.GetSheetList(), " "); got != "Summary Results Flags Methods" {
		t.Errorf("sheets %s", got)
	}
	for sheet, row := range map[string]int{"Results": 4, "Flags": 3} {
		tables, err := f.GetTables(sheet)
		must(t, err)
		if len(tables) != 1 || tables[0].Name != sheet {
			t.Errorf("%s: tables %v", sheet, tables)
		}
		panes, err := f.GetPanes(sheet)
		must(t, err)
		if !panes.Freeze || panes.YSplit != row {
			t.Errorf("%s: panes %+v", sheet, panes)
		}
	}
	titles := 0
	for _, d := range f.GetDefinedName() {
		if d.Name == "_xlnm.Print_Titles" {
			titles++
		}
	}
	if titles != 3 {
		t.Errorf("%d sheets repeat their heads in print, want 3", titles)
	}
	for _, sheet := range f.GetSheetList() {
		hf, err := f.GetHeaderFooter(sheet)
		must(t, err)
		if !strings.Contains(hf.OddFooter, "Page &P of &N") || !strings.Contains(hf.OddFooter, "Result mark ") || !strings.Contains(hf.OddHeader, "A && B") {
			t.Errorf("%s: header %q, footer %q", sheet, hf.OddHeader, hf.OddFooter)
		}
		p, err := f.GetPageLayout(sheet)
		must(t, err)
		if *p.Size != 9 || *p.FitToWidth != 1 || *p.FitToHeight != 0 {
			t.Errorf("%s: page %+v", sheet, p)
		}
	}
}

// Charts, pictures and coloured cells survive the stream writer, which loses what
// is added after its rows (they are counted in the written file).
func TestWorkingsAreComplete(t *testing.T) {
	dir := rendered(t, 30, func(s *RenderSettings) { s.Pictures = false }, "references", "parafac")
	z, err := zip.OpenReader(filepath.Join(dir, "workings.xlsx"))
	must(t, err)
	defer z.Close()
	count := map[string]int{}
	for _, f := range z.File {
		r, err := f.Open()
		must(t, err)
		part, err := io.ReadAll(r)
		must(t, err)
		if strings.HasPrefix(f.Name, "xl/charts/") {
			count["series"] += bytes.Count(part, []byte("<ser>")) + bytes.Count(part, []byte("<c:ser>"))
		}
		if strings.HasPrefix(f.Name, "xl/drawings/drawing") {
			count["placed chart"] += bytes.Count(part, []byte("<xdr:graphicFrame"))
			count["placed picture"] += bytes.Count(part, []byte("<xdr:pic>"))
		}
		if strings.HasPrefix(f.Name, "xl/worksheets/sheet") {
			count["map"] += bytes.Count(part, []byte("<colorScale>"))
			count["drawing"] += bytes.Count(part, []byte("<drawing "))
		}
	}
	// two quality variables; two methods with excitation and emission spectra
	for kind, want := range map[string]int{"placed chart": 2 + 2*2, "placed picture": 30, "map": worstMaps, "drawing": 4, "series": 2*6 + 2*2*4} {
		if count[kind] != want {
			t.Errorf("%d × %s, want %d (%v)", count[kind], kind, want, count)
		}
	}
}

// LibreOffice, a program that knows nothing of the library, reads the same numbers.
func TestWorkbookInLibreOffice(t *testing.T) {
	if testing.Short() {
		t.Skip("takes seconds")
	}
	office, err := exec.LookPath("soffice")
	if err != nil {
		t.Skip("LibreOffice is not installed")
	}
	dir := rendered(t, 12, func(s *RenderSettings) { s.Pictures = false }, "parafac")
	for _, name := range []string{"report.xlsx", "workings.xlsx"} {
		// every sheet as CSV in UTF-8, numbers with all digits
		cmd := exec.Command(office, "-env:UserInstallation=file://"+t.TempDir(), "--headless", "--convert-to", "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,-1",
			"--outdir", dir, filepath.Join(dir, name))
		if out, err := cmd.CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
	}
	shown, err := os.ReadFile(filepath.Join(dir, "report-Results.csv"))
	must(t, err)
	r := csv.NewReader(bytes.NewReader(shown))
	r.FieldsPerRecord = -1
	rows, err := r.ReadAll()
	must(t, err)
	got := map[string][]string{}
	for _, row := range rows {
		got[row[0]] = row
	}
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	first := slices.Index(rows[2], "1 Tryptophan-like, RU")
	if first < 0 {
		first = slices.Index(rows[3], "1 Tryptophan-like, RU")
	}
	for i := range c.Rows {
		id, k := visible(c.Text(i, 0)), slices.Index(fixtureNames, c.Text(i, 1))
		if got[id] == nil {
			t.Fatalf("no row of %q", id)
		}
		text, want := got[id][first+3*k], c.Float(i, c.Col("value"))
		switch c.Text(i, c.Col("qualifier")) {
		case "R":
			if text != c.Text(i, c.Col("reported")) {
				t.Errorf("%s: %q", id, text)
			}
			continue
		case "U":
			want = c.Float(i, c.Col("detection_limit"))
		}
		if v, err := strconv.ParseFloat(text, 64); err != nil || math.Abs(v-want) > 1e-14*want {
			t.Errorf("%s %s: LibreOffice reads %q, written was %g", id, c.Text(i, 1), text, want)
		}
	}
	for _, sheet := range []string{"Components", "Budget", "Thumbnails", "Provenance"} {
		if info, err := os.Stat(filepath.Join(dir, "workings-"+sheet+".csv")); err != nil || info.Size() < 50 {
			t.Errorf("LibreOffice sees nothing on the sheet %s of workings.xlsx: %v", sheet, err)
		}
	}
}

// hash of every file in a folder.
func hashes(t testing.TB, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	must(t, filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := os.ReadFile(path)
		rel, _ := filepath.Rel(dir, path)
		out[rel] = fmt.Sprintf("%x", sha256.Sum256(b))
		return err
	}))
	return out
}

// The same results give the same bytes, in every file, whatever the number of
// workers.
func TestSameBytes(t *testing.T) {
	one := hashes(t, rendered(t, 9, func(s *RenderSettings) { s.Workers = 1 }, "parafac"))
	four := hashes(t, rendered(t, 9, func(s *RenderSettings) { s.Workers = 4 }, "parafac"))
	if len(one) < 30 || len(one) != len(four) {
		t.Fatalf("%d and %d files", len(one), len(four))
	}
	for name, h := range one {
		if four[name] != h {
			t.Errorf("%s differs", name)
		}
	}
}

// Text from outside stays text: formulas, markup, direction marks, very long ids.
func TestHostileText(t *testing.T) {
	dir := t.TempDir()
	f := newFixture(t, 9, "parafac")
	f.write(t, dir)
	evil := []string{"=1+1", "+SUM(A1)", "-2", "@cmd", "\t=1", `"><script>alert(1)</script>`, "a\r\nb", "\u202eevil", strings.Repeat("long ", 2000), "{{.}}", "\x00\x01"}
	flags, err := ReadTable(filepath.Join(dir, "flags.csv"))
	must(t, err)
	for _, e := range evil {
		put(flags, "TL-0001", "b", e, "parafac", "unexplained", "doubt", 1.0, 2.0, e, e, 1)
	}
	must(t, flags.WriteFile(dir))
	s := testSettings()
	s.Pictures = false
	s.Title, s.Client, s.Remarks = evil[0], evil[5], evil[8]
	must(t, Render(context.Background(), dir, s, nil))
	for _, name := range []string{"report.xlsx", "workings.xlsx"} {
		x, err := excelize.OpenFile(filepath.Join(dir, name))
		must(t, err)
		for _, sheet := range x.GetSheetList() {
			rows, err := x.GetRows(sheet)
			must(t, err)
			for r := range rows {
				for c := range rows[r] {
					at, _ := excelize.CoordinatesToCellName(c+1, r+1)
					if formula, _ := x.GetCellFormula(sheet, at); formula != "" {
						t.Errorf("%s %s!%s holds the formula %q", name, sheet, at, formula)
					}
				}
			}
		}
		must(t, x.Close())
	}
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	must(t, err)
	for _, bad := range []string{"<script>alert", "<img src=x", "\u202e"} {
		if bytes.Contains(page, []byte(bad)) {
			t.Errorf("the page holds %q as it is", bad)
		}
	}
}

func TestRenderNamesWhatIsWrong(t *testing.T) {
	for name, spoil := range map[string]func(dir string) error{
		"samples.csv": func(d string) error { return os.Remove(filepath.Join(d, "samples.csv")) },
		"survey.nc":   func(d string) error { return os.Truncate(filepath.Join(d, StoreName), 5000) },
		"flags.csv":   func(d string) error { return os.WriteFile(filepath.Join(d, "flags.csv"), []byte("id,batch\n"), 0o600) },
	} {
		dir := t.TempDir()
		newFixture(t, 3, "parafac").write(t, dir)
		must(t, spoil(dir))
		if err := Render(context.Background(), dir, testSettings(), nil); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("%s spoilt: error %v", name, err)
		}
	}
}

// Results without a store, a model or bottles still make a report.
func TestRenderWithLittle(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9).write(t, dir) // nothing but maps
	must(t, Render(context.Background(), dir, testSettings(), nil))
	must(t, os.Remove(filepath.Join(dir, StoreName)))
	must(t, os.Remove(filepath.Join(dir, "models.csv")))
	must(t, Render(context.Background(), dir, testSettings(), nil))
	empty := t.TempDir()
	must(t, NewSamples([]string{"id", "kind"}).WriteFile(empty))
	must(t, New("contributions.csv").WriteFile(empty))
	must(t, Render(context.Background(), empty, testSettings(), nil))
}

func TestRenderStops(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9, "parafac").write(t, dir)
	ctx, stop := context.WithCancel(context.Background())
	err := Render(ctx, dir, testSettings(), func(done, total int, what string) {
		if done == 3 {
			stop()
		}
		if done > total {
			t.Errorf("%d of %d done", done, total)
		}
	})
	if err == nil {
		t.Error("a cancelled report gave no error")
	}
}

func BenchmarkRender(b *testing.B) {
	for _, n := range []int{40, 400} {
		b.Run(strconv.Itoa(n), func(b *testing.B) {
			dir := b.TempDir()
			newFixture(b, n, "parafac").write(b, dir)
			for b.Loop() {
				must(b, Render(context.Background(), dir, testSettings(), nil))
			}
			b.ReportMetric(float64(b.Elapsed().Milliseconds())/float64(b.N)/float64(n), "ms/bottle")
		})
	}
}

// BenchmarkTriptych is one bottle's picture, drawn and written.
func BenchmarkTriptych(b *testing.B) {
	dir := b.TempDir()
	newFixture(b, 9, "parafac").write(b, dir)
	s, err := OpenStore(filepath.Join(dir, StoreName))
	must(b, err)
	defer s.Close()
	tri := newTriptych(s.Grid, s.Unit, s.Methods, []string{"PARAFAC, 4 components"}, numbers{})
	for b.Loop() {
		x, err := s.Sample(3)
		must(b, err)
		var buf bytes.Buffer
		must(b, tri.draw(triptychText{id: x.ID}, []panels{newPanels(x, "parafac")}).encode(&buf))
	}
}
