package correct_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestFactorsShape: the table's own values on its points; between them monotone
// data stay monotone (SciPy 1.10.1, PchipInterpolator([380 384 396 400 408
// 420], [1 1.5 4 4.5 4.5 3]) at 386, 390, 410: METHODS CHK-3a); outside nothing.
func TestFactorsShape(t *testing.T) {
	f, err := correct.NewFactors([]float64{380, 384, 396, 400, 408, 420}, []float64{1, 1.5, 4, 4.5, 4.5, 3}, []float64{0.1, 0.1, 0.2, 0.2, 0.2, 0.2}, "f.csv")
	if err != nil {
		t.Fatal(err)
	}
	ax, _ := eem.NewAxis([]float64{379, 380, 386, 390, 396, 410, 420, 421})
	got, rel := f.On(ax)
	for i, want := range []float64{math.NaN(), 1, 1.8518518518518519, 2.75, 4, 4.444444444444445, 3, math.NaN()} {
		if math.IsNaN(want) != math.IsNaN(got[i]) || math.IsNaN(want) != math.IsNaN(rel[i]) {
			t.Errorf("%g nm: %g, want %g", ax.At(i), got[i], want)
		} else if !math.IsNaN(want) {
			near(t, "factor", got[i], want, 1e-12)
		}
	}
	near(t, "relative uncertainty", rel[3], 0.15/2.75, 1e-12)
}

// TestFactorsChecked: tables that would break the interpolation are refused.
func TestFactorsChecked(t *testing.T) {
	for want, c := range map[string][2][]float64{
		"400 nm follows 400 nm": {{400, 400}, {1, 1}},
		"factor 0 at 410 nm":    {{400, 410}, {1, 0}},
		"factor NaN at 400 nm":  {{400, 410}, {math.NaN(), 1}},
		"one factor":            {{400, 410}, {1}},
		"at least one value":    {nil, nil},
		"factor +Inf at 400 nm": {{400}, {math.Inf(1)}},
	} {
		if _, err := correct.NewFactors(c[0], c[1], nil, ""); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v: %v, want %q", c, err, want)
		}
	}
	if _, err := correct.NewFactors([]float64{400}, []float64{1}, []float64{-1}, ""); err == nil {
		t.Error("a negative uncertainty passed")
	}
}

// TestSpectral: cell = counts × excitation factor × emission factor; outside a
// table missing and told; causes carry their size per cell.
func TestSpectral(t *testing.T) {
	ex, _ := correct.NewFactors([]float64{250, 300}, []float64{2, 4}, []float64{0.02, 0.04}, "ex.csv")
	em, _ := correct.NewFactors([]float64{400, 500}, []float64{1, 0.5}, nil, "em.csv")
	g := grid(t, []float64{250, 275, 310}, []float64{400, 500, 501})
	e := eem.FromCells(g, eem.Counts, []float64{10, 20, 30, 40, 50, 60, 70, 80, math.NaN()})
	e.Var = slices.Repeat([]float64{1}, 9)
	out := correct.Spectral(e, ex, em)
	want := []float64{20, 20, math.NaN(), 120, 75, math.NaN(), math.NaN(), math.NaN(), math.NaN()}
	for i, w := range want {
		if math.IsNaN(w) {
			if !math.IsNaN(out.F[i]) {
				t.Errorf("cell %d: %g outside the factors", i, out.F[i])
			}
			continue
		}
		near(t, "cell", out.F[i], w, 1e-12)
		near(t, "variance", out.Var[i], (w/e.F[i])*(w/e.F[i]), 1e-12)
		near(t, "cause", out.Causes[0].Shape[i], 0.01*w, 1e-12)
	}
	if w := []eem.Reason{0, 0, eem.Uncorrected, 0, 0, eem.Uncorrected, eem.Uncorrected, eem.Uncorrected, eem.NotMeasured}; !slices.Equal(out.Why, w) {
		t.Errorf("reasons %v", out.Why)
	}
	if n := finding(t, out, "factor-range"); n.Value != 4 {
		t.Errorf("%+v", n)
	}
	if len(out.Causes) != 1 || out.Causes[0].Key != "ex.csv" {
		t.Errorf("causes %+v", out.Causes)
	}
	if same := correct.Spectral(e, nil, nil); !slices.Equal(same.F[:8], e.F[:8]) {
		t.Error("no factors changed the EEM")
	}
}
