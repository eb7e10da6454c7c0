package optics_test

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"tarnlight/eem"
	"tarnlight/eem/optics"
)

// TestEveryIndexOrReason: whatever a file holds, the lists have the same names in
// the same order, and each entry has a number or a reason, never both or neither.
func TestEveryIndexOrReason(t *testing.T) {
	names := func(list []optics.Index) (s []string) {
		for _, ix := range list {
			s = append(s, ix.Name)
		}
		return s
	}
	flat := fill(steps(t, 240, 400, 40), steps(t, 280, 560, 20), func(_, _ float64) float64 { return 1 })
	fluorescence, regions := names(optics.Fluorescence(flat)), names(optics.Regions(flat))
	rapid.Check(t, func(rt *rapid.T) {
		e := flat.Clone()
		some := rapid.OneOf(rapid.Float64Range(-1, 10), rapid.SampledFrom([]float64{0, math.NaN(), 1e-300, 1e300}))
		f := eem.FromCells(e.Grid, eem.Raman, rapid.SliceOfN(some, len(e.F), len(e.F)).Draw(rt, "f"))
		a := &eem.Absorbance{Axis: steps(t, 240, 680, 10), PathCM: 1, A: rapid.SliceOfN(some, 45, 45).Draw(rt, "A")}
		lists := [][]optics.Index{optics.Fluorescence(f), optics.Regions(f), optics.Absorption(a, rapid.Float64Range(-1, 10).Draw(rt, "doc"))}
		if !slices.Equal(names(lists[0]), fluorescence) || !slices.Equal(names(lists[1]), regions) {
			rt.Fatal("other names or another order")
		}
		for _, ix := range slices.Concat(lists...) {
			if (ix.Refused == "") == (math.IsNaN(ix.Value) || math.IsInf(ix.Value, 0)) {
				rt.Fatalf("%s: %g, %q", ix.Name, ix.Value, ix.Refused)
			}
		}
	})
}
