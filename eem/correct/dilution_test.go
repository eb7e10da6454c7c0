package correct_test

import (
	"math"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestControlledDilution: CHK-1d, computed from the model.
func TestControlledDilution(t *testing.T) {
	for _, c := range []struct{ p, f, fp, f0, alpha float64 }{
		{2, 44.932896411722155, 33.51600230178197, 100, 0.8},
		{3, 44.932896411722155, 25.530944612154958, 100, 0.8},
		{4, 18.268352405273465, 16.344244628246184, 100, 1.7},
	} {
		g := grid(t, []float64{350}, []float64{400, 450, 500})
		e := eem.FromCells(g, eem.Counts, []float64{c.f, -1, 2 * c.f})
		d := eem.FromCells(g, eem.Counts, []float64{c.fp, 1, 2 * c.fp})
		out, factor := correct.ControlledDilution(e, d, c.p)
		near(t, "F0", out.F[0], c.f0, 1e-12)
		near(t, "twice as strong", out.F[2], 2*c.f0, 1e-12)
		near(t, "factor", factor[0], math.Exp(c.alpha), 1e-12)
		if out.Why[1] == eem.Measured || !math.IsNaN(out.F[1]) {
			t.Errorf("a negative cell gave %g", out.F[1])
		}
	}
}

// TestControlledDilutionNoise: SEC-1.5-noise (computed): relative noise grows
// √(p²+1)/(p−1) times; an error of scale shared by both stays as it is.
func TestControlledDilutionNoise(t *testing.T) {
	g := grid(t, []float64{350}, []float64{400})
	for p, want := range map[float64]float64{2: 2.23606797749979, 3: 1.5811388300841898, 4: 1.3743685418725535} {
		e, d := eem.FromCells(g, eem.Counts, []float64{40}), eem.FromCells(g, eem.Counts, []float64{30})
		e.Var, d.Var = []float64{0.4 * 0.4}, []float64{0.3 * 0.3}
		e.Causes = []eem.Cause{{Name: "scale", U: 0.02}}
		d.Causes = e.Causes
		out, _ := correct.ControlledDilution(e, d, p)
		near(t, "noise", math.Sqrt(out.Var[0])/out.F[0]/0.01, want, 1e-12)
		near(t, "scale", out.Causes[0].Shape[0]/out.F[0], 0.02, 1e-12)
	}
}
