package correct_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestLinearisation: CHK-1a, computed from P ∝ 1 − e^(−x): how much too high the
// linear form is, at x = ln(10)·A.
func TestLinearisation(t *testing.T) {
	x := []float64{0.01, 0.02, 0.05, 0.1, 0.1151292546497023, 0.2, 0.5, 1.0}
	a := []float64{0.004342944819032518, 0.008685889638065035, 0.02171472409516259, 0.04342944819032518, 0.05, 0.08685889638065036, 0.21714724095162588, 0.43429448190325176}
	r := []float64{0.9950166250831947, 0.9900663346622349, 0.9754115099857198, 0.9516258196404043, 0.9445823496133934, 0.9063462346100907, 0.7869386805747332, 0.6321205588285577}
	excess := []float64{0.005008333319444391, 0.010033333111113096, 0.025208324653294367, 0.050833194477504895, 0.058668945496693325, 0.1033311132253989, 0.2707470412683992, 0.5819767068693265}
	nm := make([]float64, len(x))
	for i := range nm {
		nm[i] = float64(240 + 10*i)
	}
	g := grid(t, nm, []float64{300})
	got := correct.Linear(g.Ex, &eem.Absorbance{Axis: g.Ex, A: a, PathCM: 1}, 1)
	for i, l := range got {
		near(t, "x", l.X, x[i], 1e-12)
		near(t, "excess", l.Excess, excess[i], 1e-12)
		near(t, "r", 1/(1+l.Excess), r[i], 1e-12)
	}
}

// TestLinearRange: the note tells worst value, excitations and limit; nothing is
// said of a liquid within the range.
func TestLinearRange(t *testing.T) {
	g := grid(t, []float64{250, 300, 350}, []float64{400})
	e := eem.FromCells(g, eem.Counts, []float64{1, 1, 1})
	a := &eem.Absorbance{Axis: g.Ex, A: []float64{0.1, 0.05, 0.02}, PathCM: 1}
	out := correct.LinearRange(e, a, 1, 0)
	n := out.Notes[len(out.Notes)-1]
	if n.Test != "linear-range" || n.Severity != eem.Remark || n.Limit != 0.05 || math.Abs(n.Value-0.1*math.Ln10) > 1e-15 ||
		!strings.Contains(n.Msg, "2 of 3 excitations, up to ex 300 nm") {
		t.Errorf("%+v", n)
	}
	if out := correct.LinearRange(e, a.Times(0.1), 1, 0); len(out.Notes) != 0 {
		t.Errorf("a clear liquid: %+v", out.Notes)
	}
}
