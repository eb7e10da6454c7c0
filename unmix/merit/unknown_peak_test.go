package merit

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
)

// The maximum of a noisy band is found to a grid step where the highest point is
// many steps off, also of a band with a tail; one with structure keeps the peak that
// is highest, and one without noise its plain maximum.
func TestClearPeak(t *testing.T) {
	em, err := eem.Steps(280, 600, 2)
	if err != nil {
		t.Fatal(err)
	}
	band := func(nm, width, tail float64) func(x float64) float64 { // log-normal in nm
		return func(x float64) float64 {
			z := (x - nm) / width
			if 1+tail*z <= 0 {
				return 0
			}
			if tail != 0 {
				z = math.Log(1+tail*z) / tail
			}
			return math.Exp(-z * z / 2)
		}
	}
	vibronic := func(x float64) float64 {
		s := 0.0
		for i, h := range []float64{1, 0.75, 0.85, 0.4} {
			s += h * math.Exp(-math.Pow((x-374-10*float64(i))/3, 2)/2)
		}
		return s
	}
	for _, c := range []struct {
		name string
		f    func(x float64) float64
		sd   float64
		max  int // steps that the peak may be off
	}{
		{"plain", band(494, 32, 0), 0.05, 1},
		{"tail", band(494, 30, 0.25), 0.05, 1},
		{"narrow", band(350, 12, 0.1), 0.05, 1},
		{"vibronic", vibronic, 0.02, 1},
		{"no noise", band(494, 30, 0.25), 0, 0},
		{"no noise, vibronic", vibronic, 0, 0},
	} {
		v := make([]float64, em.Len())
		truth := 0
		for k := range v {
			if v[k] = c.f(em.At(k)); v[k] > v[truth] {
				truth = k
			}
		}
		off, plain := 0, 0
		const tries = 200
		for seed := range tries {
			rnd := rand.New(rand.NewPCG(uint64(seed), 3))
			noisy := make([]float64, len(v))
			for k, x := range v {
				noisy[k] = math.Max(0, x+c.sd*rnd.NormFloat64())
			}
			if d := clearPeak(em, noisy) - truth; d > c.max || d < -c.max {
				off++
			}
			if d := floats.MaxIdx(noisy) - truth; d > c.max || d < -c.max {
				plain++
			}
		}
		t.Logf("%s: %d of %d off by more than %d steps, the highest point %d", c.name, off, tries, c.max, plain)
		if off > tries/20 {
			t.Errorf("%s: %d of %d off by more than %d steps", c.name, off, tries, c.max)
		}
	}
}
