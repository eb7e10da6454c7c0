package report

import (
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
	"tarnlight/unmix"

	"github.com/xuri/excelize/v2"
)

// Every number in the workbook, read back, is the one in contributions.csv: to
// 1e-14, because the library writes 15 digits.
func TestWorkbookEqualsContributions(t *testing.T) {
	testkit.Heavy(t)
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
			same("±", get(n+1), unmix.ExpandedOf(c.Float(i, c.Col("value")), c.Float(i, c.Col("standard_uncertainty")), c.Float(i, c.Col("lower95")), c.Float(i, c.Col("upper95"))))
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
	b := newBook("", "", "")
	for text, want := range map[string]string{"0.371": "0.000", "< 0.013": "0.000", "12": "0", "9.1e-5": "0.0E+0", "< 9.1e-5": "0.0E+0", "not usable": "0.00"} {
		if got := b.statedFormat("", strings.TrimPrefix(text, "< "), 1.5); got != want {
			t.Errorf("%q: %s, want %s", text, got, want)
		}
	}
	// what was rounded before the point shows so, and every other number as it is
	for _, c := range []struct {
		mark, text string
		v          float64
		want       string
	}{{"", "70", 68.3, `[<65]0;[>=75]0;"70"`}, {"< ", "210", 213.2, `[<205]"< "0;[>=215]"< "0;"< 210"`}, {"", "200", 149.9999 + 1, `[<150]0;[>=250]0;"200"`}, {"", "70", 70.2, "0"}, {"", "0", 4.4, `[<-5]0;[>=5]0;"0"`}} {
		if got := b.statedFormat(c.mark, c.text, c.v); got != c.want {
			t.Errorf("%g as %s%s: %s, want %s", c.v, c.mark, c.text, got, c.want)
		}
	}
	for v := 1003.0; len(b.special) < mostFormats; v += 10 { // Excel takes 200 to 250 formats of one's own
		b.statedFormat("", Number(v-3), v)
	}
	if got := b.statedFormat("< ", "123450", 123453); got != `"< "0.0000E+0` {
		t.Errorf("one format too many: %s", got)
	}
	if got := b.statedFormat("", "70", 68.3); got != `[<65]0;[>=75]0;"70"` {
		t.Errorf("a format that is there: %s", got)
	}
}

// A number of the workings has five digits at most, no zeros behind them and no bare
// point ("0.####" shows 100.00001 as "100.").
func TestShortFormat(t *testing.T) {
	for v, want := range map[float64]string{100.00000000000001: "0", 99.936: "0.000", 0.5: "0.0", 25.022799163387564: "0.000", 1e-9: "0.####E+00", 12: "0", 0: "0"} {
		if got := shortFormat(v); got != want {
			t.Errorf("%g: %s, want %s", v, got, want)
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

// Print cuts no value from its ± and qualifier, no page is wider than paper, and a
// sheet that fits on one is not cut.
func TestPrintCutsBetweenTriples(t *testing.T) {
	l := layout{widths: []float64{12, 16}}
	if l.starts() != nil {
		t.Error("a narrow sheet is cut")
	}
	for range 14 {
		l.keep = append(l.keep, len(l.widths)+2, len(l.widths)+3)
		l.widths = append(l.widths, 11, 8.5, 5)
	}
	l.widths = append(l.widths, 10, 11, 50)
	starts := l.starts()
	if len(starts) == 0 {
		t.Fatal("a wide sheet is not cut")
	}
	for _, c := range starts {
		if slices.Contains(l.keep, c) {
			t.Errorf("a page begins with column %d, inside a triple", c)
		}
	}
	if scale := l.scale(starts); scale < smallestPrint || scale > 100 {
		t.Errorf("print at %d %%", scale)
	}
}
