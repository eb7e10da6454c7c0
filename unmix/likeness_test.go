package unmix_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"tarnlight/unmix"
)

// CHK-6i: limits of T² for new samples, computed from the published formula
// (Tracy, Young & Mason 1992).
func TestT2Limit(t *testing.T) {
	for _, c := range []struct {
		n, a       int
		rate, want float64
	}{{20, 2, 0.05, 7.879268}, {20, 2, 0.01, 13.328606}, {30, 3, 0.05, 9.856873}, {30, 3, 0.01, 15.319316}} {
		if got := unmix.T2Limit(c.n, c.a, c.rate); math.Abs(got-c.want) > 5e-7 {
			t.Errorf("n %d, a %d, %g: %.6f, want %.6f", c.n, c.a, c.rate, got, c.want)
		}
	}
}

// New bottles of the training set's kind exceed each limit at the stated rate
// (4,000 bottles at 5 %: 200 ± 14; the description of 400 bottles adds as much),
// and a bottle of another kind exceeds both.
func TestLikenessRate(t *testing.T) {
	rnd := rand.New(rand.NewPCG(5, 6))
	draw := func() ([]float64, float64) {
		a, b := rnd.NormFloat64(), rnd.NormFloat64()
		q := 0.0
		for range 20 {
			z := rnd.NormFloat64()
			q += z * z
		}
		return []float64{math.Exp(a), math.Exp(0.5*a + b), math.Exp(2 + 0.3*rnd.NormFloat64())}, q / 1e4
	}
	var value, left []float64
	for range 400 {
		v, q := draw()
		value, left = append(value, v...), append(left, q)
	}
	l, err := unmix.NewLikeness(value, 3, left, 0.05)
	if err != nil {
		t.Fatal(err)
	}
	far, over := 0, 0
	for range 4000 {
		v, q := draw()
		if l.Distance(v) > l.T2 {
			far++
		}
		if q > l.Residual {
			over++
		}
	}
	for name, n := range map[string]int{"T²": far, "residual": over} {
		if n < 130 || n > 270 {
			t.Errorf("%s: %d of 4,000 like bottles exceed the 5 %% limit", name, n)
		}
	}
	if d := l.Distance([]float64{100, 0.01, 50}); d < l.T2 {
		t.Errorf("an odd bottle has T² %.3g, limit %.3g", d, l.T2)
	}
	if _, err := unmix.NewLikeness(value[:9], 3, left[:3], 0.05); err == nil {
		t.Error("three bottles described three components")
	}
}
