package synth

import (
	"fmt"
	"math"
	"reflect"
	"testing"

	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

func TestTrilinearFollowsModel(t *testing.T) {
	c, truth := Trilinear(TrilinearSpec{Samples: 7, Components: 4, Seed: 3})
	for i := range c.Len() {
		for j := range c.Ex.Len() {
			for k := range c.Em.Len() {
				want := 0.0
				for f, a := range truth.Scores[i] {
					want += a * truth.Ex[f][j] * truth.Em[f][k]
				}
				if got := c.Sample(i)[c.Index(j, k)]; math.Abs(got-want) > 1e-12*truth.Max {
					t.Fatalf("sample %d cell (%d, %d): %g, model %g", i, j, k, got, want)
				}
			}
		}
	}
	for f := range 4 {
		if a, b := maxOf(truth.Ex[f]), maxOf(truth.Em[f]); a != 1 || b != 1 {
			t.Errorf("component %d: maxima %g and %g, want 1", f, a, b)
		}
	}
}

func TestTrilinearCells(t *testing.T) {
	c, _ := Trilinear(TrilinearSpec{Samples: 2, Components: 3, Scatter: true})
	if c.Ex.Len() != 46 || c.Em.Len() != 151 {
		t.Fatalf("grid %s", c.Grid)
	}
	present := 0
	for i, w := range c.SampleWhy(1) {
		if w == eem.Measured {
			present++
		} else if !math.IsNaN(c.Sample(1)[i]) {
			t.Fatalf("cell %d is %s but holds %g", i, w, c.Sample(1)[i])
		}
	}
	if present != 4756 {
		t.Errorf("%d cells left, want 4,756 of 6,946", present)
	}
}

// The noise must have the stated size and the cube must state it. 20 × 6,946
// draws put the standard error of a variance ratio at 0.4 %.
func TestTrilinearNoise(t *testing.T) {
	spec := TrilinearSpec{Samples: 20, Components: 3, Seed: 9}
	clean, truth := Trilinear(spec)
	for _, s := range []struct{ flat, shot float64 }{{0.005, 0}, {0, 0.01}, {0.002, 0.01}} {
		spec.Noise, spec.Shot, spec.Known = s.flat, s.shot, true
		noisy, again := Trilinear(spec)
		if !reflect.DeepEqual(truth, again) {
			t.Fatal("noise changed the truth")
		}
		z := make([]float64, len(clean.X))
		for i := range z {
			v := clean.X[i]
			sd := math.Sqrt(s.flat*s.flat*truth.Max*truth.Max + s.shot*s.shot*truth.Max*v)
			if d := math.Abs(float64(noisy.U[i])/sd - 1); d > 1e-6 {
				t.Fatalf("cell %d: U %g, want %g", i, noisy.U[i], sd)
			}
			z[i] = (noisy.X[i] - v) / sd
		}
		mean, sd := stat.MeanStdDev(z, nil)
		if math.Abs(mean) > 0.012 || math.Abs(sd-1) > 0.008 {
			t.Errorf("flat %g shot %g: standardised noise has mean %g, sd %g", s.flat, s.shot, mean, sd)
		}
	}
}

func TestTrilinearGaps(t *testing.T) {
	c, _ := Trilinear(TrilinearSpec{Samples: 50, Components: 5, Gaps: 0.3, Scatter: true})
	clipped := 0
	for i := range c.Len() {
		n := 0
		for _, w := range c.SampleWhy(i) {
			if w == eem.Saturated {
				n++
			}
		}
		if n > 0 {
			clipped++
		}
		if n > 2000 {
			t.Errorf("sample %d: %d clipped cells", i, n)
		}
	}
	if clipped != 15 {
		t.Errorf("%d clipped samples, want 15 of 50", clipped)
	}
}

func TestTrilinearScores(t *testing.T) {
	_, truth := Trilinear(TrilinearSpec{Samples: 2000, Components: 3, Correlation: 0.96, Seed: 1,
		Ex: steps(250, 400, 25), Em: steps(300, 500, 25)})
	if r := logCorrelation(truth.Scores); math.Abs(r-0.96) > 0.01 {
		t.Errorf("correlation of log scores %g, want 0.96", r)
	}
	_, truth = Trilinear(TrilinearSpec{Samples: 200, Components: 3, Rare: 3, Weak: 0.1})
	n := 0
	for _, a := range truth.Scores {
		if a[2] > 0 {
			n++
		}
	}
	if n != 3 {
		t.Errorf("rare component in %d samples, want 3", n)
	}
}

// Overlap: components of natural water resemble one another, but must differ
// enough that a solver can be asked for them.
func TestTrilinearOverlap(t *testing.T) {
	for seed := range uint64(20) {
		for _, f := range []int{3, 5, 6} {
			_, truth := Trilinear(TrilinearSpec{Samples: 1, Components: f, Seed: seed})
			if r := worst(truth, f); r > 0.93 || r < 0.1 {
				t.Errorf("seed %d, %d components: largest congruence of a pair %g", seed, f, r)
			}
		}
	}
	_, truth := Trilinear(TrilinearSpec{Samples: 1, Components: 3, Close: true, Seed: 2})
	if r := cosine(truth.Em[0], truth.Em[1]); r < 0.9 {
		t.Errorf("close spectra have emission congruence %g", r)
	}
}

func TestTrilinearSameBytes(t *testing.T) {
	spec := TrilinearSpec{Samples: 5, Components: 4, Noise: 0.005, Shot: 0.01, Scatter: true, Gaps: 0.4, Seed: 11}
	a, ta := Trilinear(spec)
	b, tb := Trilinear(spec)
	for i := range a.X {
		if math.Float64bits(a.X[i]) != math.Float64bits(b.X[i]) {
			t.Fatalf("cell %d differs", i)
		}
	}
	if !reflect.DeepEqual(ta, tb) || !reflect.DeepEqual(a.Why, b.Why) {
		t.Error("truth or reasons differ")
	}
	spec.Seed++
	if c, _ := Trilinear(spec); fmt.Sprint(c.X[:500]) == fmt.Sprint(a.X[:500]) {
		t.Error("another seed gives the same cube")
	}
}

func BenchmarkTrilinear1000(b *testing.B) {
	for b.Loop() {
		Trilinear(TrilinearSpec{Samples: 1000, Components: 5, Noise: 0.005, Scatter: true})
	}
}

func worst(t *Truth, f int) float64 {
	r := 0.0
	for a := range f {
		for b := range a {
			r = max(r, cosine(t.Ex[a], t.Ex[b])*cosine(t.Em[a], t.Em[b]))
		}
	}
	return r
}

func cosine(a, b []float64) float64 {
	var ab, aa, bb float64
	for i := range a {
		ab, aa, bb = ab+a[i]*b[i], aa+a[i]*a[i], bb+b[i]*b[i]
	}
	return ab / math.Sqrt(aa*bb)
}

func logCorrelation(s [][]float64) float64 {
	x, y := make([]float64, len(s)), make([]float64, len(s))
	for i := range s {
		x[i], y[i] = math.Log(s[i][0]), math.Log(s[i][1])
	}
	return stat.Correlation(x, y, nil)
}

func maxOf(v []float64) float64 {
	m := v[0]
	for _, x := range v {
		m = max(m, x)
	}
	return m
}
