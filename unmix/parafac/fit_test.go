package parafac

import (
	"context"
	"math"
	"testing"

	"tarnlight/eem"
)

func TestFitRecoversTruth(t *testing.T) {
	s := simulate(simulation{samples: 40, nj: 23, nk: 50, comps: 4, noise: 0.002, scatter: true, seed: 1})
	r := fit(t, s.cube, 4, nil)
	if w := s.worst(r); w < 0.999 {
		t.Errorf("worst congruence %g", w)
	}
	if r.Status != Converged || r.Certificate > goodEnough {
		t.Errorf("%s, certificate %g", r.Status, r.Certificate)
	}
	model := make([]float64, s.cube.Cells())
	var sse float64
	for i := range s.cube.Len() {
		r.ModelTo(model, i)
		for q, v := range s.cube.Sample(i) {
			if s.cube.SampleWhy(i)[q] == eem.Measured {
				sse += (v - model[q]) * (v - model[q])
			}
		}
	}
	if math.Abs(sse/r.SSE-1) > 1e-12 {
		t.Errorf("residuals give %g, the result says %g", sse, r.SSE)
	}
}

func fit(t testing.TB, c *eem.Cube, components int, s *Settings) *Result {
	t.Helper()
	r, err := Fit(context.Background(), c, components, s)
	if err != nil {
		t.Fatal(err)
	}
	return r
}
