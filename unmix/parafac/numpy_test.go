package parafac

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"testing"

	"tarnlight/eem"
)

// lcg is Knuth's MMIX generator, as in testdata/parafac/als.py.
type lcg uint64

func (g *lcg) uniform() float64 {
	*g = *g*6364136223846793005 + 1442695040888963407
	return float64(*g>>11) / (1 << 53)
}

// lcgSurvey makes the survey of als.py with the same seed, to rounding.
func lcgSurvey(seed int) (*eem.Cube, int) {
	g := lcg(seed)
	i, j, k, f := 10+seed%5, 8, 14, 2+seed%2
	a, b, c := make([]float64, i*f), make([]float64, j*f), make([]float64, k*f)
	lorentz := func(x []float64, n, r int, peak, width float64) {
		for q := range n {
			d := (float64(q) - peak) / width
			x[q*f+r] = 1 / (1 + d*d)
		}
	}
	for r := range f {
		pb := 1 + 5*(float64(r)+0.5*g.uniform())/float64(f)
		pc := 2 + 10*(float64((r+1)%f)+0.5*g.uniform())/float64(f)
		lorentz(b, j, r, pb, 2)
		lorentz(c, k, r, pc, 2.5)
		for q := range i {
			a[q*f+r] = 0.2 + g.uniform()
		}
	}
	x := make([]float64, i*j*k)
	for s := range i {
		for y := range j {
			for z := range k {
				v := &x[(s*j+y)*k+z]
				for r := range f {
					*v += a[s*f+r] * b[y*f+r] * c[z*f+r]
				}
				*v += 0.02 * (g.uniform() + g.uniform() + g.uniform() + g.uniform() - 2)
				if d := z - y; d >= -1 && d <= 1 || g.uniform() < 0.03 {
					*v = math.NaN()
				}
			}
		}
	}
	return cubeOf(x, i, j, k), f
}

// The optimum of 20 surveys with scatter bands and single gaps is that of an
// independent fit: plain alternating least squares in NumPy 1.24.2 with SciPy
// 1.10.1, testdata/parafac/als.py, run as /usr/bin/python3 als.py > als.json.
func TestAgreesWithPlainAlternatingLeastSquares(t *testing.T) {
	b, err := os.ReadFile(filepath.Join("..", "..", "testdata", "parafac", "als.json"))
	if err != nil {
		t.Fatal(err)
	}
	var want []struct {
		Seed, Components, Cells int
		SST, SSE                float64
	}
	if err := json.Unmarshal(b, &want); err != nil || len(want) != 20 {
		t.Fatalf("%d surveys, %v", len(want), err)
	}
	for _, w := range want {
		c, f := lcgSurvey(w.Seed)
		r := fit(t, c, f, &Settings{RawSamples: true, Starts: 10})
		cells := 0
		for _, n := range r.Cells {
			cells += n
		}
		if f != w.Components || cells != w.Cells || math.Abs(r.SST/w.SST-1) > 1e-12 {
			t.Fatalf("survey %d is not the one of the script: %d cells, sum of squares %.15g", w.Seed, cells, r.SST)
		}
		for x := range f {
			for _, ok := range append(append([]bool(nil), r.exRes[x]...), r.emRes[x]...) {
				if !ok {
					t.Errorf("survey %d has damped loadings; the script knows none", w.Seed)
				}
			}
		}
		if d := r.SSE/w.SSE - 1; math.Abs(d) > 1e-6 {
			t.Errorf("survey %d: sum of squares %.10g, the script's %.10g (relative %g)", w.Seed, r.SSE, w.SSE, d)
		}
	}
}
