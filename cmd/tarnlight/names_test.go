package main

import (
	"testing"

	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
)

// Splits name the components of the chosen model as the other tables do, those of
// other candidates by their number or by the spectrum that they hold.
func TestNamesInSplits(t *testing.T) {
	two, three := &parafac.Result{Components: 2, Held: []string{"", ""}}, &parafac.Result{Components: 3, Held: []string{"", "pyrene", ""}}
	j := &job{fit: two, fits: []*parafac.Result{two, three},
		res: []*unmix.Resolution{{Set: &unmix.Set{Method: "parafac", Components: []unmix.Component{{Name: "humic"}, {Name: "C4"}}}}}}
	for _, c := range []struct {
		components, f int
		want          string
	}{{2, 0, "humic"}, {2, 1, "C4"}, {3, 0, "C1"}, {3, 1, "pyrene"}, {3, 2, "C3"}} {
		if got := j.nameIn(c.components, c.f); got != c.want {
			t.Errorf("component %d of %d is called %q, want %q", c.f+1, c.components, got, c.want)
		}
	}
}
