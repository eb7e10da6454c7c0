package report

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

// An axis is logarithmic where half of what was found lies in the lowest tenth of a
// linear one, and not for little.
func TestUnevenly(t *testing.T) {
	for _, c := range []struct {
		found []float64
		want  bool
	}{{nil, false}, {[]float64{1, 2, 3, 100}, true}, {[]float64{100, 3, 1, 2}, true}, {[]float64{1, 100}, false},
		{[]float64{1, 2, 15, 100}, false}, {[]float64{0, 0, 0, 5}, false}, {[]float64{1, 1.5, 2, 2.5, 3}, false}} {
		if got := unevenly(c.found); got != c.want {
			t.Errorf("%v: %t", c.found, got)
		}
	}
}

// One very bright bottle does not flatten the others, what was not found is drawn at its
// limit, and the Summary counts usable samples alone.
func TestBrightBottle(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	newFixture(t, 24, "parafac").write(t, dir)
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	c.Rows[0][c.Col("value")], c.Rows[0][c.Col("upper95")] = "312.5", "320"
	must(t, c.WriteFile(dir))
	must(t, Render(context.Background(), dir, testSettings(), nil))
	svg, err := os.ReadFile(filepath.Join(dir, "figures", "contributions-parafac-by-site.svg"))
	must(t, err)
	if text := string(svg); strings.Count(text, "logarithmic axis") != 1 || !strings.Contains(text, ">1000<") {
		t.Error("not exactly one panel is logarithmic up to 1000")
	}
	num, err := ReadTable(filepath.Join(dir, "figures", "contributions-parafac-by-site.csv"))
	must(t, err)
	at := 0
	for i := range num.Rows {
		want := num.Float(i, num.Col("value"))
		if num.Text(i, num.Col("qualifier")) == "U" {
			want = 0.013 // the fixture's detection limit
			at++
		}
		if got := num.Float(i, num.Col("drawn_at")); got != want {
			t.Errorf("row %d is drawn at %g, want %g", i, got, want)
		}
	}
	if at == 0 {
		t.Error("nothing is not detected")
	}
	x, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer x.Close()
	rows, err := x.GetRows("Summary")
	must(t, err)
	found := ""
	for _, row := range rows {
		if len(row) > 2 && row[0] == "1 "+fixtureNames[0] {
			found = row[2]
		}
	}
	if found != "22 of 22" { // 24 less a field blank (TL-0012) and the dark bottle
		t.Errorf("found in %q", found)
	}
}
