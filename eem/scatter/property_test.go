package scatter_test

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
)

// TestChecksNeverFail: whatever a file holds, looking for ridges does not panic,
// and what is found are numbers.
func TestChecksNeverFail(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		ex, em := steps(t, 300, 340, 10), steps(t, 280, 450, 5)
		any := func(name string) *eem.EEM {
			n := ex.Len() * em.Len()
			return eem.FromCells(eem.Grid{Ex: ex, Em: em}, eem.Counts, rapid.SliceOfN(rapid.OneOf(
				rapid.Float64Range(-10, 1e5), rapid.Float64Range(0, 1), rapid.Float64(), rapid.SampledFrom([]float64{0, math.NaN()})), n, n).Draw(rt, name))
		}
		e, b := any("sample"), any("blank")
		for _, l := range []scatter.Line{scatter.Rayleigh1, scatter.Raman1, scatter.Rayleigh2} {
			ps := scatter.Ridge(e, l, 20)
			if s, ok := scatter.Offset(ps); ok && (math.IsNaN(s.NM) || math.Abs(s.NM) > 10) {
				rt.Fatalf("%+v", s)
			}
			if band, ok := scatter.AutoBand(ps, l, eem.Rayleigh1); ok && !(band.Below > 0 && band.Above > 0 && band.Below+band.Above < 400) {
				rt.Fatalf("%+v", band)
			}
			if r, u, ok := scatter.Seen(e, b, l, 20); ok && (math.IsNaN(r) || math.IsNaN(u)) {
				rt.Fatalf("%g ± %g", r, u)
			}
			for _, n := range append(scatter.CheckWavelength(e, l, 20, 0).Notes, scatter.CheckLight(e, b, l, 20, 0).Notes...) {
				if n.Test != "" {
					eem.FlagFrom(n, "", "") // panics on a code that is not on the list
				}
			}
		}
	})
}
