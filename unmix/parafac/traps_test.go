package parafac

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
)

// On unit-norm data extrapolation once killed components in 92 of 96 starts;
// all must reach the optimum, at any scale of the data.
func TestEveryStartReachesTheOptimum(t *testing.T) {
	reached, starts := 0, 0
	for seed := range uint64(12) {
		s := simulate(simulation{samples: 30, nj: 14, nk: 36, comps: 4, noise: 0.005, scatter: true, seed: 100 + seed})
		for i := range s.cube.X {
			s.cube.X[i] *= []float64{1, 1e-6, 1e6}[seed%3]
		}
		r := fit(t, s.cube, 4, &Settings{Starts: 8})
		for _, o := range r.Starts {
			starts++
			if o.Agrees {
				reached++
			}
		}
	}
	if reached != 96 || starts != 96 {
		t.Errorf("%d of %d starts reached the optimum, want 96 of 96", reached, starts)
	}
}

// Where a component is seen only through the mask, nothing may run away: the
// loading is damped and marked, and what is not marked is right.
func TestUndeterminedLoadingsAreDampedAndMarked(t *testing.T) {
	for seed := range uint64(6) {
		s := simulate(simulation{samples: 40, nj: 20, nk: 44, comps: 4, noise: 0.005, scatter: true, seed: 200 + seed})
		g := s.cube.Grid
		for i := range s.cube.Len() { // emission below 350 nm is open at the two shortest excitations alone
			for q := range g.Cells() {
				if g.Em.At(q%g.Em.Len()) < 350 && q/g.Em.Len() > 1 {
					s.cube.Sample(i)[q], s.cube.SampleWhy(i)[q] = math.NaN(), eem.Rayleigh1
				}
			}
		}
		r := fit(t, s.cube, 4, nil)
		marked, kept := 0, 0
		for _, p := range Match(s.ex, s.em, r.Ex, r.Em) {
			for _, m := range []struct {
				truth, got []float64
				ok         []bool
			}{{s.ex[p.A], r.Ex[p.B], r.ExDetermined[p.B]}, {s.em[p.A], r.Em[p.B], r.EmDetermined[p.B]}} {
				k, wrong := compareWhere(m.truth, m.got, m.ok)
				kept += k
				marked += len(m.got) - k
				if wrong > 0.1 {
					t.Errorf("seed %d component %d: a loading that counts as determined is off by %.2f of the maximum", seed, p.A, wrong)
				}
			}
			for _, v := range append(append([]float64(nil), r.Ex[p.B]...), r.Em[p.B]...) {
				if !(v >= 0 && v <= 1) {
					t.Errorf("seed %d: loading %g", seed, v)
				}
			}
		}
		if marked == 0 || kept < 3*marked {
			t.Errorf("seed %d: %d loadings marked, %d kept", seed, marked, kept)
		}
	}
}

// compareWhere returns how many loadings are determined and by how much the
// worst of them is off, at the best scale.
func compareWhere(truth, got []float64, ok []bool) (kept int, worst float64) {
	x, y := only(truth, ok), only(got, ok)
	s := dot(x, y) / math.Max(dot(y, y), 1e-300)
	for i := range x {
		if ok[i] {
			kept++
			worst = math.Max(worst, math.Abs(s*y[i]-x[i]))
		}
	}
	return kept, worst
}

func TestUnusableDataIsAnErrorThatSaysWhatToDo(t *testing.T) {
	c := small(1).cube
	same, zero := c.Select(identity(4)), c.Select(identity(4))
	for i := range same.X {
		same.X[i], same.Why[i] = 3, eem.Measured
		zero.X[i], zero.Why[i] = 0, eem.Measured
	}
	gone := c.Select(identity(4))
	for i := range gone.X {
		gone.X[i] = math.NaN()
	}
	for _, k := range []struct {
		name string
		cube *eem.Cube
		f    int
		says string
	}{
		{"more components than samples", c.Select(identity(3)), 4, "fewer components"},
		{"one sample", c.Select([]int{0}), 1, "needs 2 samples"},
		{"no sample", c.Select(nil), 1, "no sample"},
		{"no component", c, 0, "ask for 1 to"},
		{"too many components", c, 1000, "ask for 1 to"},
		{"constant data", same, 2, "look at the lamp"},
		{"zeros", zero, 2, "look at the lamp"},
		{"nothing measured", gone, 1, "too few"},
	} {
		r, err := Fit(context.Background(), k.cube, k.f, nil)
		if err == nil || !strings.Contains(err.Error(), k.says) {
			t.Errorf("%s: %v (result %v), want a message with %q", k.name, err, r != nil, k.says)
		}
		if _, err = Choose(context.Background(), k.cube, k.f, k.f, nil, nil); err == nil {
			t.Errorf("%s: Choose has no error", k.name)
		}
	}
}

// Samples or wavelengths without data, zeros, NaN and Inf among the cells: noted
// where it matters, and never a NaN in the result.
func TestHolesGiveNotesAndNeverNaN(t *testing.T) {
	s := small(1)
	c := s.cube
	n, nk := c.Cells(), c.Em.Len()
	for q := range n {
		c.X[2*n+q] = math.NaN()                    // a sample without data
		c.X[3*n+q], c.Why[3*n+q] = 0, eem.Measured // one without light
	}
	for i := range c.Len() {
		for k := range nk {
			c.X[i*n+4*nk+k] = math.NaN() // an excitation without data
		}
		for j := range c.Ex.Len() {
			c.X[i*n+j*nk+9] = math.Inf(1) // an emission
		}
	}
	c.X[5*n+2*nk+20], c.Why[6*n+2*nk+21] = 1e300, eem.Spike
	c.Why[5*n+2*nk+20] = eem.Spike // filled or spiked cells do not count
	for _, set := range []*Settings{nil, {Unconstrained: true}, {RawSamples: true}} {
		r := fit(t, c, 3, set)
		if r.Fitted[2] || !r.Fitted[3] {
			t.Errorf("fitted: %v", r.Fitted)
		}
		var text string
		for _, n := range r.Notes {
			text += n.Msg + "\n"
		}
		for _, want := range []string{"s002 has 0 measured cells", "s003 holds nothing but zeros", "1 excitation wavelengths", "1 emission wavelengths"} {
			if !strings.Contains(text, want) {
				t.Errorf("no note %q in:\n%s", want, text)
			}
		}
		all := append(append([]float64{r.SSE, r.Explained, r.Certificate, r.CoreConsistency, r.TripleCosine, r.Structure}, r.Scores...), r.ScoreSE...)
		for f := range 3 {
			all = append(append(append(append(all, r.Ex[f]...), r.Em[f]...), r.ExSE[f]...), r.EmSE[f]...)
			if r.ExDetermined[f][4] || r.EmDetermined[f][9] {
				t.Error("a loading without any data counts as determined")
			}
		}
		for _, v := range append(append(all, r.Leverage...), r.Influence...) {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Fatalf("%g in the result", v)
			}
		}
		if w := s.worst(r); w < 0.99 {
			t.Errorf("worst congruence %g", w)
		}
	}
}

func TestCancelledFitReturnsTheContextsError(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	told := 0
	_, err := Fit(ctx, small(1).cube, 3, &Settings{Workers: 1, Progress: func(int, int, string) {
		if told++; told == 2 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) || told < 2 {
		t.Errorf("error %v after %d reports", err, told)
	}
	if (&Result{}).Status == Converged || Status(0).String() == Converged.String() {
		t.Error("the zero status counts as success")
	}
}
