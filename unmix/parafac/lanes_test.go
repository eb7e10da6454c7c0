package parafac

import (
	"context"
	"math"
	"testing"
)

// Side by side or one after the other, the scores and the loss are the same.
func TestSweepsTogetherAreSweepsAlone(t *testing.T) {
	set := (&Settings{}).withDefaults()
	for _, samples := range []int{2, 3, 9, 24} {
		c := simulate(simulation{samples: samples, nj: 12, nk: 30, comps: 2, noise: 0.05, scatter: true, seed: 9}).cube
		p, err := newProblem(c, 2, &set)
		if err != nil {
			t.Fatal(err)
		}
		s := newALS(p.whole(), 2, &set)
		s.random(1, 1, nil)
		if _, err := s.iterate(context.Background(), 1e-12, 3); err != nil {
			t.Fatal(err)
		}
		for i := range s.a {
			s.a[i] = float64(i%3) * 0.1
		}
		o := newALS(s.data, 2, &set)
		o.take(s)
		s.updateA(innerSweeps)
		o.modelRows()
		o.products()
		o.ridgeA()
		o.loss = o.x2
		for i := range samples {
			o.solveRow(o.a[2*i:2*i+2], o.gk, o.m[2*i:2*i+2], o.lam, nil, 0, innerSweeps)
			o.addLoss(i, o.gk)
		}
		for i, v := range s.a {
			if math.Abs(v-o.a[i]) > 1e-14 { // fused products differ by a rounding
				t.Errorf("%d samples, score %d: %g together, %g alone", samples, i, v, o.a[i])
			}
		}
		if math.Abs(s.loss-o.loss) > 1e-13*s.x2 {
			t.Errorf("%d samples: loss %g together, %g alone", samples, s.loss, o.loss)
		}
	}
}
