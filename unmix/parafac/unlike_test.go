package parafac

import "testing"

// A sample with something the model does not know is found, and of the others
// about as many are flagged as chance explains.
func TestUnlikeSamplesAreFound(t *testing.T) {
	s := simulate(simulation{samples: 120, nj: 12, nk: 30, comps: 3, noise: 0.01, scatter: true, seed: 71})
	odd, n := 17, s.cube.Cells()
	for q := range n { // a narrow band that no other sample has
		if k := q % s.cube.Em.Len(); k >= 20 && k < 23 {
			s.cube.X[odd*n+q] += 0.5
		}
	}
	r := fit(t, s.cube, 3, &Settings{Starts: 4})
	found, chance := r.Unlike(0.01)
	others, hit := 0, false
	for _, u := range found {
		if u.Sample == odd && u.Kind == "residual" {
			hit = true
		} else {
			others++
		}
		if u.Value <= u.Limit {
			t.Errorf("%+v", u)
		}
	}
	t.Logf("%d others flagged, %.1f by chance", others, chance)
	if !hit {
		t.Error("the odd sample is not found")
	}
	if chance < 2.3 || chance > 2.4 || others > 9 { // Poisson of 2.4: above 9 once in 10,000
		t.Errorf("%d others flagged, %.2f expected by chance", others, chance)
	}
	for i, v := range r.Influence {
		if v > r.Influence[odd] {
			t.Errorf("sample %d has more influence (%.2f) than the odd one (%.2f)", i, v, r.Influence[odd])
		}
	}
}
