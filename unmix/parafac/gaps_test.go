package parafac

import (
	"math"
	"testing"
)

// Gaps of single bottles, few or many, end at the optimum of the samples
// themselves with their true gaps, compressed or not.
func TestCompressionAndGapsEndAtTheSameOptimum(t *testing.T) {
	for name, every := range map[string]int{"no gaps": 1000, "few": 20, "many": 3, "all": 1} {
		s := simulate(simulation{samples: 180, nj: 12, nk: 30, comps: 3, noise: 0.01, scatter: true, seed: 31})
		if every < 1000 {
			clip(s.cube, every)
		}
		set := (&Settings{RawSamples: true, Starts: 3}).withDefaults() // so that SSE is what the fit lowers
		r := fit(t, s.cube, 3, &set)
		p, err := newProblem(s.cube, 3, &set)
		if err != nil {
			t.Fatal(err)
		}
		all, err := runStarts(t.Context(), p.whole(), 3, &set, nil)
		if err != nil {
			t.Fatal(err)
		}
		q, _, err := conclude(t.Context(), s.cube, p, all, goodEnough, &set)
		if err != nil {
			t.Fatal(err)
		}
		// 1e-3 standard errors are 1e-11 of the loss; the ridge that stays on
		// damped loadings lets its part, SSE, differ a little more.
		if d := math.Abs(r.SSE/q.SSE - 1); d > 1e-7 {
			t.Errorf("%s: sums of squares differ by %g", name, d)
		}
		if r.Certificate > certified || r.Status != Converged {
			t.Errorf("%s: certificate %g, %s", name, r.Certificate, r.Status)
		}
		sameModel(t, q, r, identity(180), 1, 1e-3)
	}
}

// What is compressed differs from the rows by no more than what lies beyond the
// leading space: an exact model of low rank comes back exactly.
func TestCompressionKeepsLowRankRowsExactly(t *testing.T) {
	s := simulate(simulation{samples: 170, nj: 8, nk: 20, comps: 5, seed: 3})
	set := (&Settings{}).withDefaults()
	p, err := newProblem(s.cube, 5, &set)
	if err != nil {
		t.Fatal(err)
	}
	b := compress(p.x, identity(170), 12, 1)
	for n, u := range b.u {
		x := make([]float64, p.p)
		for r, v := range u {
			axpy(v, b.rows[r], x)
		}
		axpy(-1, p.x[n], x)
		if e := norm(x); e > 1e-12 {
			t.Fatalf("row %d is off by %g", n, e)
		}
	}
}
