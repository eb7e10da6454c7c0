package correct_test

import (
	"math"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

func grid(t testing.TB, ex, em []float64) eem.Grid {
	t.Helper()
	a, err := eem.NewAxis(ex)
	if err != nil {
		t.Fatal(err)
	}
	b, err := eem.NewAxis(em)
	if err != nil {
		t.Fatal(err)
	}
	return eem.Grid{Ex: a, Em: b}
}

// TestBlankThenScale: (sample − blank) over the Raman area, by hand.
func TestBlankThenScale(t *testing.T) {
	g := grid(t, []float64{350}, []float64{371, 400, 428})
	e := eem.FromCells(g, eem.Counts, []float64{10, 20, 30})
	b := eem.FromCells(g, eem.Counts, []float64{1, 2, 1})
	r, err := correct.Areas([]*eem.EEM{b}, 350, [2]float64{371, 428}, "")
	if err != nil {
		t.Fatal(err)
	}
	if want := 1.5*29 + 1.5*28; math.Abs(r.Area-want) > 1e-12 {
		t.Fatalf("area %g, want %g", r.Area, want)
	}
	out := correct.RamanUnits(correct.Blank(e, b), r, "d1")
	for i, want := range []float64{9, 18, 29} {
		if math.Abs(out.F[i]*r.Area-want) > 1e-12 {
			t.Errorf("cell %d: %g, want %g", i, out.F[i]*r.Area, want)
		}
	}
	if out.Unit != eem.Raman {
		t.Errorf("unit %s", out.Unit)
	}
}
