package parafac

import (
	"context"
	"testing"

	"tarnlight/eem"
)

func TestFitRecoversTruth(t *testing.T) {
	s := simulate(simulation{samples: 40, nj: 23, nk: 50, comps: 4, noise: 0.002, scatter: true, seed: 1})
	r := fit(t, s.cube, 4, nil)
	if w := s.worst(r); w < 0.99 {
		t.Errorf("worst congruence %g", w)
	}
}

func TestMeasuredSurveys(t *testing.T) {
	c := measured(t, "amino_acids", false, func(ex, em, v float64) bool { return em < ex+10 })
	r := fit(t, c, 3, nil)
	if r.Explained < 99.9 {
		t.Errorf("amino acids, 3 components: %.3f %% explained, want 99.9", r.Explained)
	}
	c = measured(t, "cave_dripwater", false, func(ex, em, v float64) bool { return false })
	r = fit(t, c, 5, &Settings{RawSamples: true})
	if r.Explained < 94.21 {
		t.Errorf("drip water, 5 components: %.3f %% explained, want 94.21", r.Explained)
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
