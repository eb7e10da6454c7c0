package merit_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// elsewhere resolves the last bottle of a cube once more, by the set as a model file
// keeps it, and returns both spreads.
func elsewhere(t *testing.T, c *eem.Cube, set *unmix.Set, src *merit.Sources) (here, there merit.Spread, errs []unmix.SpectraError) {
	t.Helper()
	r, sp := spreads(t, c, set, src)
	var cells []int
	for i := range c.Cells() {
		cells = append(cells, i)
	}
	errs = merit.SpectraErrors(c, r, src, cells)
	last := c.Len() - 1
	frozen := *set
	frozen.Errors = errs
	own := &merit.Sources{Causes: [][]eem.Cause{src.Causes[last]}}
	_, other := spreads(t, c.Select([]int{last}), &frozen, own)
	return sp[last], other[0], errs
}

// A bottle that shares nothing with the standards but the references has the same
// uncertainty when it is resolved by a model file's copy of them: every cause behind
// the references goes with it.
func TestSpectraErrorsOfStandards(t *testing.T) {
	amounts := [][]float64{{10, 0}, {20, 0}, {0, 30}, {0, 15}, {1, 1.5}}
	c, _ := mixture(amounts, []float64{430, 460}, 1e-2, 3)
	names, units := []string{"a", "b"}, []string{"mg/L", "mol/L"}
	var standards []unmix.Standard
	refs := &merit.References{Row: []int{0, 1, 2, 3}, Given: amounts[:4]}
	src := &merit.Sources{References: refs, Stock: 0.02, Scatter: []merit.Scatter{{U: 0.03, DF: 4, Source: "test"}, {U: 0.03, DF: 4, Source: "test"}}}
	for s, v := range amounts[:4] {
		standards = append(standards, unmix.Standard{EEM: eem.FromCells(c.Grid, c.Unit, c.Sample(s)), Conc: map[string]float64{"a": v[0], "b": v[1]}})
		day := []string{"1", "2"}[s%2]
		src.Causes = append(src.Causes, []eem.Cause{
			{Name: "intensity scale", Scope: eem.OfBatch, Key: day, U: 0.05, DF: 3, Source: "test"},
			{Name: "repeatability", Scope: eem.OfBottle, Key: string(rune('A' + s)), U: 0.01, Source: "test"}})
	}
	src.Causes = append(src.Causes, []eem.Cause{{Name: "intensity scale", Scope: eem.OfBatch, Key: "3", U: 0.05, DF: 3, Source: "test"}})
	set, _, err := unmix.FromStandards(c.Grid, c.Unit, names, units, standards)
	if err != nil {
		t.Fatal(err)
	}
	refs.Weights = unmix.WeightsOf(c.Grid, names, standards)
	here, there, errs := elsewhere(t, c, set, src)
	want := map[string]bool{"noise of the standards": true, merit.CauseScatter: true, "standards": true,
		"intensity scale of the standards": true, "repeatability of the standards": true}
	for _, e := range errs {
		delete(want, e.Cause)
		if e.Shifts == nil || e.Source == "" {
			t.Errorf("%+v", e)
		}
	}
	if len(want) > 0 {
		t.Errorf("not in the model: %v", want)
	}
	for f := range here.U {
		near(t, "u", there.U[f], here.U[f], 1e-6)
		near(t, "critical value", there.Critical[f], here.Critical[f], 1e-6)
	}
}

// The same of loadings that were resolved: their covariance goes with the model.
func TestSpectraErrorsOfLoadings(t *testing.T) {
	c, set := mixture([][]float64{{1, 2}, {1, 0.2}}, []float64{430, 450}, 1e-3, 4)
	for f := range set.Components {
		set.Components[f].AmountUnit = ""
	}
	rnd := rand.New(rand.NewPCG(7, 7))
	moves := make([][2][][]float64, 20)
	for l := range moves {
		for range set.Components {
			ex, em := make([]float64, c.Ex.Len()), make([]float64, c.Em.Len())
			for k := range em {
				em[k] = 0.003 * rnd.NormFloat64()
			}
			moves[l][0], moves[l][1] = append(moves[l][0], ex), append(moves[l][1], em)
		}
	}
	src := &merit.Sources{Causes: make([][]eem.Cause, 2), Loadings: &merit.Loadings{Samples: len(moves),
		Move: func(l int) (ex, em [][]float64) { return moves[l][0], moves[l][1] }}}
	here, there, errs := elsewhere(t, c, set, src)
	if len(errs) != 1 || errs[0].Cause != "loadings" || len(errs[0].Shifts) > 4 {
		t.Errorf("%d errors: %+v", len(errs), errs)
	}
	for f := range here.U {
		near(t, "u", there.U[f], here.U[f], 1e-6)
	}
	set.Errors = nil
	_, bare := spreads(t, c.Select([]int{1}), set, &merit.Sources{})
	if bare[0].U[0] > here.U[0]/2 {
		t.Errorf("without the loadings' errors ± %g, with them %g", bare[0].U[0], here.U[0])
	}
	last := bare[0].Terms[len(bare[0].Terms)-1]
	if last.Cause != "loadings" || last.U != nil || last.Source != "not given" || math.IsNaN(bare[0].U[0]) {
		t.Errorf("nobody knows the loadings: %+v", last)
	}
}
