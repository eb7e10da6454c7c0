package correct_test

import (
	"math"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/testkit"
)

// TestQuinineLine: by hand: c = 1, 2, 4 and F = 11, 19, 41 give
// k = (11+38+164)/21; the line of its own is 0.5 + 10.07c.
func TestQuinineLine(t *testing.T) {
	g := grid(t, []float64{350}, []float64{440, 460})
	var es []*eem.EEM
	for _, f := range []float64{11, 19, 41} {
		es = append(es, eem.FromCells(g, eem.Counts, []float64{f - 1, f + 1}))
	}
	q, err := correct.Quinine(es, []float64{1, 2, 4}, 350, 450)
	if err != nil {
		t.Fatal(err)
	}
	k := 213.0 / 21
	near(t, "slope", q.Slope, k, 1e-14)
	ss := math.Pow(11-k, 2) + math.Pow(19-2*k, 2) + math.Pow(41-4*k, 2)
	near(t, "u", q.U, math.Sqrt(ss/2/21), 1e-14)
	// x̄ = 7/3, ȳ = 71/3, Sxx = 14/3, Sxy = 213 − 497/3 = 142/3: b = 71/7, a = 71/3 − 71/3 = 0.
	if math.Abs(q.Intercept) > 1e-12 {
		t.Errorf("intercept %g, want 0", q.Intercept)
	}
	out := correct.QuinineUnits(es[0], q, "d1")
	near(t, "first standard", out.Interp(350, 450), 11/k, 1e-14)
	if out.Unit != eem.Quinine || len(out.Causes) != 1 || out.Causes[0].Key != "d1" {
		t.Errorf("%s, %+v", out.Unit, out.Causes)
	}
}

// TestQuinineRefused: what gives no scale is an error in words.
func TestQuinineRefused(t *testing.T) {
	g := grid(t, []float64{350}, []float64{440, 460})
	e := eem.FromCells(g, eem.Counts, []float64{10, 10})
	for want, c := range map[string]struct {
		es []*eem.EEM
		c  []float64
		em float64
	}{
		"no quinine standard":          {nil, nil, 450},
		"no value at ex 350 / em 470":  {[]*eem.EEM{e}, []float64{1}, 470},
		"do not grow":                  {[]*eem.EEM{e}, []float64{0}, 450},
		"a concentration is 0 or more": {[]*eem.EEM{e}, []float64{-1}, 450},
	} {
		if _, err := correct.Quinine(c.es, c.c, 350, c.em); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
}

// TestMeasuredQuinine: four measured quinine solutions, 0.05–0.30 mg/L (M.
// Kammer, data set flu of the R package hyperSpec): each one in units of the
// other three comes out within 7 %, and their own line's intercept, which the
// README beside the data mentions, is found.
func TestMeasuredQuinine(t *testing.T) {
	dir := testkit.Shared(t, "data", "quinine_dilution")
	spectra, conc := testkit.Records(t, filepath.Join(dir, "spectra.csv")), testkit.Records(t, filepath.Join(dir, "concentrations.csv"))
	es, microg := quinineSeries(t, spectra, conc)
	if len(es) != 4 {
		t.Fatalf("%d solutions", len(es))
	}
	all, err := correct.Quinine(es, microg, 350, 450)
	if err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(all.Intercept) > 2*all.InterceptU) { // −9.6 ± 3.7 counts at 450 nm
		t.Errorf("intercept %g ± %g; the series has one", all.Intercept, all.InterceptU)
	}
	for i := range es {
		var rest []*eem.EEM
		var c []float64
		for j := range es {
			if j != i {
				rest, c = append(rest, es[j]), append(c, microg[j])
			}
		}
		q, err := correct.Quinine(rest, c, 350, 450)
		if err != nil {
			t.Fatal(err)
		}
		got := correct.QuinineUnits(es[i], q, "").Interp(350, 450)
		t.Logf("%g µg/L: found %.2f (%+.1f %%)", microg[i], got, 100*(got/microg[i]-1))
		if math.Abs(got/microg[i]-1) > 0.07 {
			t.Errorf("%g µg/L: found %g", microg[i], got)
		}
	}
}

// quinineSeries pairs the columns of spectra with their concentrations, µg/L.
func quinineSeries(t *testing.T, spectra, conc [][]string) (es []*eem.EEM, microg []float64) {
	number := func(s string) float64 {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	var em []float64
	for _, r := range spectra[1:] {
		em = append(em, number(r[0]))
	}
	for _, c := range conc[1:] {
		for col, name := range spectra[0] {
			if name != c[0] {
				continue
			}
			var f []float64
			for _, r := range spectra[1:] {
				f = append(f, number(r[col]))
			}
			es = append(es, eem.FromCells(grid(t, []float64{350}, em), eem.Counts, f))
			microg = append(microg, 1000*number(c[1]))
		}
	}
	return es, microg
}
