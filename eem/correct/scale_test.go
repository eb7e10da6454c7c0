package correct_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// triangle is the blank of CHK-2c: 0 at 382, 10 at 397, 0 at 418 nm.
func triangle(em float64) float64 {
	switch {
	case em > 382 && em <= 397:
		return 10 * (em - 382) / 15
	case em > 397 && em < 418:
		return 10 * (418 - em) / 21
	}
	return 0
}

func blankOf(t *testing.T, ex []float64, from, to, step float64, f func(em float64) float64) *eem.EEM {
	em := span(from, to, step)
	g := grid(t, ex, em)
	v := make([]float64, 0, g.Cells())
	for range ex {
		for _, m := range em {
			v = append(v, f(m))
		}
	}
	return eem.FromCells(g, eem.Counts, v)
}

// TestRamanArea: CHK-2c (computed); window of Lawaetz & Stedmon 2009 (from
// memory). A straight baseline between the ends is zero here.
func TestRamanArea(t *testing.T) {
	window := [2]float64{371, 428}
	b := blankOf(t, []float64{350}, 365, 440, 1, triangle)
	for _, base := range []string{"", correct.NoBaseline, correct.StraightBaseline} {
		a, err := correct.Area(b, 350, window, base)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "area "+base, a, 180, 1e-12)
	}
	r, err := correct.Areas([]*eem.EEM{b}, 350, window, "")
	if err != nil {
		t.Fatal(err)
	}
	cell := eem.FromCells(grid(t, []float64{350}, []float64{450}), eem.Counts, []float64{36})
	near(t, "36 counts", correct.RamanUnits(cell, r, "d1").F[0], 0.2, 1e-12)

	raised := blankOf(t, []float64{350}, 365, 440, 1, func(em float64) float64 { return triangle(em) + 4 + 0.01*em })
	a, _ := correct.Area(raised, 350, window, correct.StraightBaseline)
	near(t, "over a sloping background", a, 180, 1e-12)
}

// TestRamanAreaEnds: window ends between grid points, and an excitation between
// two, are interpolated.
func TestRamanAreaEnds(t *testing.T) {
	b := blankOf(t, []float64{345, 355}, 365.5, 440.5, 5, func(em float64) float64 { return 2 * em })
	a, err := correct.Area(b, 350, [2]float64{371, 428}, "")
	if err != nil {
		t.Fatal(err)
	}
	near(t, "of a straight line", a, 428*428-371*371, 1e-12)
}

// TestRamanAreaMissing: the error names what the blank lacks.
func TestRamanAreaMissing(t *testing.T) {
	b := blankOf(t, []float64{350}, 365, 420, 1, triangle)
	b.Drop(b.Index(0, 20), eem.Saturated)
	_, err := correct.Area(b, 350, [2]float64{371, 428}, "")
	if err == nil || !strings.Contains(err.Error(), "lacks em 385, 428 nm") || !strings.Contains(err.Error(), "371–428 nm at ex 350 nm") {
		t.Errorf("%v", err)
	}
	if _, err := correct.Area(b, 400, [2]float64{371, 428}, ""); err == nil || !strings.Contains(err.Error(), "400 nm") {
		t.Errorf("%v", err)
	}
	if _, err := correct.Areas([]*eem.EEM{blankOf(t, []float64{350}, 365, 440, 1, func(float64) float64 { return 0 })}, 350, [2]float64{371, 428}, ""); err == nil {
		t.Error("a dark blank gave a scale")
	}
}

// TestScaleUncertainty: the blanks' scatter becomes one relative error of the
// batch.
func TestScaleUncertainty(t *testing.T) {
	var bs []*eem.EEM
	for _, s := range []float64{0.9, 1, 1.1} {
		bs = append(bs, blankOf(t, []float64{350}, 365, 440, 1, func(em float64) float64 { return s * triangle(em) }))
	}
	r, err := correct.Areas(bs, 350, [2]float64{371, 428}, "")
	if err != nil {
		t.Fatal(err)
	}
	near(t, "area", r.Area, 180, 1e-12)
	near(t, "u", r.U, 18/math.Sqrt(3), 1e-12)
	c := correct.RamanUnits(bs[0], r, "d1").Causes
	if len(c) != 1 || c[0].Scope != eem.OfBatch || c[0].Key != "d1" || c[0].Shape != nil {
		t.Fatalf("%+v", c)
	}
	near(t, "cause", c[0].U, 0.1/math.Sqrt(3), 1e-12)
}

// TestDetector: saturation before the offset, dilution at the end.
func TestDetector(t *testing.T) {
	g := grid(t, []float64{350}, []float64{400, 450, 500})
	e := eem.FromCells(g, eem.Counts, []float64{10, 999, 1000})
	out := correct.Dilute(correct.Offset(correct.Saturate(e, 1000), 5), 10)
	if out.F[0] != 50 || out.F[1] != 9940 || out.Why[2] != eem.Saturated {
		t.Errorf("%v %v", out.F, out.Why)
	}
	if testCodes(out) != "saturated diluted" || finding(t, out, "saturated").Value != 1 || finding(t, out, "diluted").Value != 10 {
		t.Errorf("%+v", out.Notes)
	}
	if got := testCodes(correct.Dilute(correct.Saturate(e, 0), 1)); got != "" {
		t.Errorf("no limit and no dilution: %q", got)
	}
	if e.F[2] != 1000 || len(e.Notes) != 0 {
		t.Error("the input changed")
	}
}
