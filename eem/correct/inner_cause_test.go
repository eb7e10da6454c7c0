package correct_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/diff/fd"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestFactorUncertainty: SEC-1.3-u (computed): u(k)/k of the centre form is
// (ln 10/2)·√2·u(A), 0.33, 0.81 and 1.63 % for u(A) of 0.002, 0.005 and 0.01 at each
// wavelength by itself, and ln(10)·b for a baseline error b that both share.
func TestFactorUncertainty(t *testing.T) {
	for u, want := range map[float64]float64{0.002: 0.0032563470670302942, 0.005: 0.008140867667575736, 0.01: 0.01628173533515147} {
		x, m := correct.Geometry{}.Sensitivity(0.3, 0.1)
		near(t, "apart", math.Hypot(x, m)*u, want, 1e-12)
		near(t, "baseline", (x+m)*u, math.Ln10*u, 1e-14)
	}
}

// TestLoss: SEC-1.3-loss (computed): at A = 0.06 the centre form says that 6.67 % of
// the light is lost and that the rest is multiplied by 1.0715; the 8 % of Kubista et
// al. 1994 (Analyst 119, 417) are of another geometry.
func TestLoss(t *testing.T) {
	k := correct.Geometry{}.Factor(0.06, 0)
	near(t, "factor", k, 1.0715193052376064, 1e-12)
	near(t, "loss", 1-1/k, 0.06674569920300899, 1e-12)
}

// TestSensitivity holds the derivatives against finite differences.
func TestSensitivity(t *testing.T) {
	w := [2]float64{0.2, 0.7}
	for _, g := range []correct.Geometry{{}, {Ex: w, Em: w}, {Ex: [2]float64{0, 1}}, {Form: correct.FrontFace}, {Form: correct.FrontFace, Ex: w},
		{Form: correct.Transmission}, {Form: correct.Transmission, Ex: w}, {PathCM: 0.4},
		{Form: correct.FrontFace, InDeg: 30, OutDeg: 60}, {Form: correct.Transmission, InDeg: 45, OutDeg: 10, Ex: w}} {
		for _, a := range [][2]float64{{1e-5, 0}, {0.02, 0.01}, {0.5, 0.1}, {2, 1}, {1, 1}} {
			x, m := g.Sensitivity(a[0], a[1])
			set := &fd.Settings{Formula: fd.Central, Step: 1e-5}
			wantX := fd.Derivative(func(v float64) float64 { return math.Log(g.Factor(v, a[1])) }, a[0], set)
			wantM := fd.Derivative(func(v float64) float64 { return math.Log(g.Factor(a[0], v)) }, a[1], set)
			near(t, g.Form+" ex", x, wantX, 1e-8)
			near(t, g.Form+" em", m, wantM, 1e-8)
		}
	}
}

// TestAbsorbanceCauses: the shapes are the change of the corrected EEM when
// baseline or path are off by one standard uncertainty.
func TestAbsorbanceCauses(t *testing.T) {
	g := grid(t, []float64{250, 300}, []float64{310, 400})
	raw := eem.FromCells(g, eem.Counts, []float64{5, 6, 7, 8})
	a := &eem.Absorbance{Axis: grid(t, []float64{240, 420}, []float64{1}).Ex, A: []float64{0.8, 0.1}, PathCM: 1}
	geo := correct.Geometry{Ex: [2]float64{0.3, 0.7}, Em: [2]float64{0.3, 0.7}}
	e, _ := correct.InnerFilter(raw, a, geo, 0)
	const u = 1e-6 // small, so that the first derivative tells all
	out := correct.AbsorbanceCauses(e, a, geo, u, u, "b7")
	shifted := a.Times(1)
	for i := range shifted.A {
		shifted.A[i] += u
	}
	longer := a.Times(1)
	longer.PathCM *= 1 + u
	for n, b := range []*eem.Absorbance{shifted, longer} {
		c := out.Causes[n]
		if c.Scope != eem.OfBottle || c.Key != "b7" {
			t.Errorf("%+v", c)
		}
		f, _ := correct.InnerFilter(raw, b, geo, 0)
		for i := range f.F {
			near(t, c.Name, c.Shape[i], f.F[i]-e.F[i], 1e-5)
		}
	}
}
