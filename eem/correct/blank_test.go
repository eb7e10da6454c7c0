package correct_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestMean: cell by cell, with the variance of the mean from the scatter; a cell
// saturated in one blank is missing, one lacking in one is the mean of the rest.
func TestMean(t *testing.T) {
	g := grid(t, []float64{350}, []float64{400, 450, 500, 550})
	nan := math.NaN()
	bs := []*eem.EEM{
		eem.FromCells(g, eem.Counts, []float64{1, 2, nan, nan}),
		eem.FromCells(g, eem.Counts, []float64{3, 9, 5, nan}),
		eem.FromCells(g, eem.Counts, []float64{5, 4, 7, nan}),
	}
	bs[1].Drop(1, eem.Saturated)
	m, err := correct.Mean(bs)
	if err != nil {
		t.Fatal(err)
	}
	if m.F[0] != 3 || m.F[2] != 6 || !math.IsNaN(m.F[1]) || !math.IsNaN(m.F[3]) {
		t.Errorf("%v", m.F)
	}
	if w := []eem.Reason{0, eem.Saturated, 0, eem.NotMeasured}; !slices.Equal(m.Why, w) {
		t.Errorf("%v", m.Why)
	}
	near(t, "variance of the mean", m.Var[0], 4.0/3, 1e-14)
	near(t, "of two", m.Var[2], 1, 1e-14)

	for i, b := range bs {
		b.Var = slices.Repeat([]float64{float64(1 + i)}, 4)
	}
	m, _ = correct.Mean(bs)
	near(t, "from the blanks' own", m.Var[0], 6.0/9, 1e-14)
	if one, _ := correct.Mean(bs[:1]); one.Var[0] != 1 {
		t.Errorf("of one blank: %g", one.Var[0])
	}
	if _, err := correct.Mean(nil); err == nil {
		t.Error("no blank gave a mean")
	}
	other := eem.New(grid(t, []float64{350}, []float64{400}), eem.Counts)
	if _, err := correct.Mean([]*eem.EEM{bs[0], other}); err == nil || !strings.Contains(err.Error(), "different grids") {
		t.Errorf("%v", err)
	}
}

// TestBlankRange: cells the blank does not cover are missing and flagged; where
// it was saturated, or its scatter cut, they are missing and no fault.
func TestBlankRange(t *testing.T) {
	e := eem.FromCells(grid(t, []float64{350}, []float64{400, 450, 500, 550}), eem.Counts, []float64{10, 20, 30, 40})
	b := eem.FromCells(grid(t, []float64{350}, []float64{400, 500, 525}), eem.Counts, []float64{1, 3, 4})
	out := correct.Blank(e, b)
	if out.F[0] != 9 || out.F[1] != 18 || out.F[2] != 27 || out.Why[3] != eem.NoBlank {
		t.Errorf("%v %v", out.F, out.Why)
	}
	if n := finding(t, out, "blank-range"); n.Value != 1 {
		t.Errorf("%+v", n)
	}
	b.Drop(2, eem.Saturated)
	b = b.Regrid(e.Grid)
	b.Drop(3, eem.Saturated)
	if out = correct.Blank(e, b); out.Why[3] != eem.NoBlank || testCodes(out) != "" {
		t.Errorf("%v %q", out.Why, testCodes(out))
	}
}

// TestBlankCauses: an error that sample and blank share acts on their difference,
// the sample's own on the sample alone, the blank's own against it.
func TestBlankCauses(t *testing.T) {
	g := grid(t, []float64{350}, []float64{400, 450})
	e, b := eem.FromCells(g, eem.Counts, []float64{100, 50}), eem.FromCells(g, eem.Counts, []float64{20, 10})
	e.Var, b.Var = []float64{4, 4}, []float64{1, 1}
	shared := eem.Cause{Name: "emission factors", Key: "em.csv", U: 0.1}
	e.Causes = []eem.Cause{shared, {Name: "absorbance baseline", Scope: eem.OfBottle, Key: "b7", U: 0.02}}
	b.Causes = []eem.Cause{{Name: "blank's own", Scope: eem.OfBatch, Key: "d1", Shape: []float64{3, 1}}, shared}
	out := correct.Blank(e, b)
	for i, want := range [][]float64{{8, 4}, {2, 1}, {-3, -1}} {
		for k, w := range want {
			near(t, out.Causes[i].Name, out.Causes[i].Shape[k], w, 1e-12)
		}
	}
	near(t, "variance", out.Var[0], 5, 0)
	if len(e.Causes) != 2 || e.Causes[0].Shape != nil {
		t.Error("the input's causes changed")
	}
	scaled := correct.Scale(out, 2, eem.Raman, eem.Note{Step: "test"})
	near(t, "scaled", scaled.Causes[0].Shape[0], 16, 1e-14)
	near(t, "not", out.Causes[0].Shape[0], 8, 1e-14)
}
