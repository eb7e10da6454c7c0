package merit_test

import (
	"math"
	"testing"

	"tarnlight/unmix/merit"
)

// CHK-6g: rook weights on a 4 × 4 grid, computed from the published formulas
// (Cliff & Ord 1981) by an independent program.
func TestMoranI(t *testing.T) {
	board := make([]float64, 16)
	ramp := make([]float64, 16)
	count := make([]float64, 16)
	for i := range 16 {
		board[i] = float64((i/4 + i%4) % 2)
		ramp[i] = float64(i / 4)
		count[i] = float64(i + 1)
	}
	for _, c := range []struct {
		name     string
		m        []float64
		i, z, zr float64 // NaN: not given
	}{
		{"checkerboard", board, -1, -5.169843, -4.842298},
		{"row ramp", ramp, 0.6666667, 4.062019, 3.898739},
		{"1..16", count, 0.6666667, math.NaN(), 3.921907},
	} {
		got := merit.MoranI(c.m, 4, 4)
		if math.Abs(got.I-c.i) > 1e-7 || math.Abs(got.ZRandom-c.zr) > 5e-7 || math.Abs(got.Z-c.z) > 5e-7 {
			t.Errorf("%s: I %.7f z %.6f zR %.6f, want %.7f %.6f %.6f", c.name, got.I, got.Z, got.ZRandom, c.i, c.z, c.zr)
		}
		if math.Abs(got.E+0.0666667) > 1e-7 {
			t.Errorf("%s: E %.7f", c.name, got.E)
		}
	}
}

// A missing cell takes its pairs with it: a map with an outer frame of NaN is the
// map itself.
func TestMoranMissing(t *testing.T) {
	small := []float64{1, 2, 4, 3, 5, 7, 2, 2, 9}
	framed := make([]float64, 25)
	for i := range framed {
		framed[i] = math.NaN()
	}
	for i := range 3 {
		copy(framed[(i+1)*5+1:], small[i*3:i*3+3])
	}
	if a, b := merit.MoranI(small, 3, 3), merit.MoranI(framed, 5, 5); a != b {
		t.Errorf("framed %+v, bare %+v", b, a)
	}
	if got := merit.MoranI([]float64{1, 1, 1, 1}, 2, 2); got.I == got.I {
		t.Errorf("constant map: I = %g, want NaN", got.I)
	}
}
