package parafac

import (
	"context"
	"encoding/json"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/eem"
)

func small(seed uint64) *survey {
	return simulate(simulation{samples: 24, nj: 12, nk: 30, comps: 3, noise: 0.01, scatter: true, seed: seed})
}

func TestLossNeverRises(t *testing.T) {
	for seed := range uint64(6) {
		for _, free := range []bool{false, true} {
			set := (&Settings{Unconstrained: free}).withDefaults()
			p, err := newProblem(small(seed).cube, 4, &set)
			if err != nil {
				t.Fatal(err)
			}
			s := newALS(p.whole(), 4, &set)
			s.random(1, int(seed), nil)
			last, steps := math.Inf(1), 0
			s.trace = func(loss float64) {
				if steps++; loss > last+roundOff*s.x2 { // the loss is what is left of x2
					t.Errorf("seed %d: loss rose from %.17g to %.17g at step %d", seed, last, loss, steps)
				}
				last = loss
			}
			if _, err := s.iterate(context.Background(), 1e-12, 300); err != nil {
				t.Fatal(err)
			}
			if steps < 10 {
				t.Errorf("only %d steps", steps)
			}
		}
	}
}

// The Gauss–Newton gradient is that of the loss it lowers: half the difference
// of losses at both sides of a point, scores solved for at each.
func TestGradientAgainstDifferences(t *testing.T) {
	c := small(3).cube
	c.X[5*c.Cells()+100], c.X[7*c.Cells()+220] = math.NaN(), math.NaN()
	set := (&Settings{}).withDefaults()
	p, err := newProblem(c, 3, &set)
	if err != nil {
		t.Fatal(err)
	}
	s := newALS(p.whole(), 3, &set)
	s.random(1, 1, nil)
	if _, err := s.iterate(context.Background(), 1e-8, 4); err != nil {
		t.Fatal(err)
	}
	n := s.newton()
	n.gradient()
	grad := slices.Clone(n.grad)
	for _, e := range []int{0, 7, 20, n.nb + 30, n.nb + 41, n.nb + 70} {
		x, _ := n.entry(e)
		at, h := *x, 1e-5
		*x = at + h
		n.exactScores()
		up := n.loss
		*x = at - h
		n.exactScores()
		*x = at
		if d := (up - n.loss) / (4 * h); math.Abs(d-grad[e]) > 1e-6*(math.Abs(d)+1e-3) {
			t.Errorf("entry %d: gradient %g, difference %g", e, grad[e], d)
		}
	}
}

// sameModel compares loadings and scores, the latter of samples order[i] of b
// with i of a and b's being scale times as large.
func sameModel(t *testing.T, a, b *Result, order []int, scale, tol float64) {
	t.Helper()
	for _, p := range Match(a.Ex, a.Em, b.Ex, b.Em) {
		for j, v := range a.Ex[p.A] {
			if d := math.Abs(v - b.Ex[p.B][j]); d > tol && a.ExDetermined[p.A][j] {
				t.Fatalf("excitation loading %d of component %d differs by %g", j, p.A, d)
			}
		}
		for k, v := range a.Em[p.A] {
			if d := math.Abs(v - b.Em[p.B][k]); d > tol && a.EmDetermined[p.A][k] {
				t.Fatalf("emission loading %d of component %d differs by %g", k, p.A, d)
			}
		}
		for i := range a.IDs {
			x, y := a.Scores[i*a.Components+p.A], b.Scores[order[i]*b.Components+p.B]/scale
			if math.Abs(x-y) > tol*(x+1) {
				t.Fatalf("score of sample %d, component %d: %g and %g", i, p.A, x, y)
			}
		}
	}
}

func TestPermutedSamplesGiveTheSameModel(t *testing.T) {
	s := small(1)
	perm := rand.New(rand.NewPCG(5, 5)).Perm(s.cube.Len())
	order := make([]int, len(perm))
	for to, from := range perm {
		order[from] = to
	}
	sameModel(t, fit(t, s.cube, 3, nil), fit(t, s.cube.Select(perm), 3, nil), order, 1, 1e-6)
}

func TestScaleOfTheDataIsCarriedThrough(t *testing.T) {
	s := small(2)
	r := fit(t, s.cube, 3, nil)
	for _, by := range []float64{1e-9, 1e6} {
		c := s.cube.Select(identity(s.cube.Len()))
		for i := range c.X {
			c.X[i] *= by
		}
		sameModel(t, r, fit(t, c, 3, nil), identity(c.Len()), by, 1e-6)
		sameModel(t, fit(t, s.cube, 3, &Settings{RawSamples: true}), fit(t, c, 3, &Settings{RawSamples: true}), identity(c.Len()), by, 1e-6)
	}
}

func identity(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}

func TestSwappedModesGiveSwappedLoadings(t *testing.T) {
	s := small(4)
	c, nj, nk := s.cube, s.cube.Ex.Len(), s.cube.Em.Len()
	x := make([]float64, len(c.X))
	for i := range c.Len() {
		for j := range nj {
			for k := range nk {
				x[i*nj*nk+k*nj+j] = c.X[i*nj*nk+j*nk+k]
			}
		}
	}
	r, q := fit(t, c, 3, nil), fit(t, cubeOf(x, c.Len(), nk, nj), 3, nil)
	q.Ex, q.Em, q.ExDetermined, q.EmDetermined = q.Em, q.Ex, q.EmDetermined, q.ExDetermined
	sameModel(t, r, q, identity(c.Len()), 1, 1e-6)
}

// Same bytes for any number of workers, compressed and not, with gaps too.
func TestWorkersDoNotChangeABit(t *testing.T) {
	s := simulate(simulation{samples: 170, nj: 10, nk: 24, comps: 3, noise: 0.01, scatter: true, seed: 6})
	clip(s.cube, 20)
	var want []byte
	for _, w := range []int{1, 2, 8} {
		ch, err := Choose(context.Background(), s.cube, 2, 3, &Settings{Workers: w, Starts: 3}, nil)
		if err != nil {
			t.Fatal(err)
		}
		got, err := json.Marshal(ch)
		if err != nil {
			t.Fatal(err)
		}
		if want != nil && string(got) != string(want) {
			t.Errorf("%d workers give other bytes than one", w)
		}
		want = got
	}
}

// clip makes the brightest twelfth of the cells of every n-th sample missing.
func clip(c *eem.Cube, every int) {
	for i := 0; i < c.Len(); i += every {
		x, why := c.Sample(i), c.SampleWhy(i)
		sorted := slices.DeleteFunc(slices.Clone(x), math.IsNaN)
		slices.Sort(sorted)
		limit := sorted[len(sorted)*11/12]
		for q, v := range x {
			if v > limit {
				x[q], why[q] = math.NaN(), eem.Saturated
			}
		}
	}
}
