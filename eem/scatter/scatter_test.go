package scatter_test

import (
	"math"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
)

// TestLineTable: positions of the Raman line, METHODS 2.5 (computed from the
// formula), printed to 0.01 nm.
func TestLineTable(t *testing.T) {
	for _, c := range []struct{ ex, s3382, s3400, s3600 float64 }{
		{230, 249.40, 249.51, 250.76}, {254, 277.87, 278.01, 279.56}, {275, 303.20, 303.36, 305.22},
		{310, 346.31, 346.52, 348.94}, {347.5, 393.78, 394.06, 397.19}, {350, 396.99, 397.28, 400.46},
		{370, 422.92, 423.24, 426.86}, {450, 530.78, 531.29, 536.99}, {488, 584.46, 585.08, 592.00},
	} {
		for shift, want := range map[float64]float64{3382: c.s3382, 3400: c.s3400, 3600: c.s3600} {
			if got := (scatter.Line{Order: 1, Shift: shift}).Em(c.ex); math.Abs(got-want) > 0.005+1e-9 {
				t.Errorf("Raman %g cm⁻¹ at ex %g: %.4f nm, want %.2f", shift, c.ex, got, want)
			}
		}
	}
	for ex, want := range map[float64]float64{230: 499.02, 240: 522.65, 250: 546.45, 260: 570.43, 270: 594.58, 275: 606.73} {
		if got := scatter.Raman2.Em(ex); math.Abs(got-want) > 0.005+1e-9 {
			t.Errorf("second-order Raman at ex %g: %.4f nm, want %.2f", ex, got, want)
		}
	}
}

// TestRidgeOfKnownShape: a Gaussian ridge 0.7 nm off its line is found there.
func TestRidgeOfKnownShape(t *testing.T) {
	ex, _ := eem.Steps(300, 320, 10)
	em, _ := eem.Steps(250, 400, 2)
	g := eem.Grid{Ex: ex, Em: em}
	f := make([]float64, g.Cells())
	for j := range ex.Len() {
		for k := range em.Len() {
			d := (em.At(k) - ex.At(j) - 0.7) / 4
			f[g.Index(j, k)] = 50 + 0.1*em.At(k) + 1000*math.Exp(-d*d/2)
		}
	}
	ps := scatter.Ridge(eem.FromCells(g, eem.Counts, f), scatter.Rayleigh1, 30)
	if len(ps) != 3 {
		t.Fatalf("%d ridges, want 3", len(ps))
	}
	for _, p := range ps {
		if math.Abs(p.Em-p.Want-0.7) > 0.05 || math.Abs(p.Width-9.42) > 0.2 || math.Abs(p.Height-1000) > 20 {
			t.Errorf("ex %g: %+v", p.ExNM, p)
		}
	}
}
