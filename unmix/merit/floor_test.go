package merit_test

import (
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/unmix/merit"
)

// Spectra that were resolved with noise and without negative loadings: where they are
// zero they are too high, so that a bottle's other component comes out too low. With
// that in the budget 93 % of the bottles that hold the detection limit are detected;
// the covariance of the loadings alone promises them too little.
func TestFloors(t *testing.T) {
	const n, sd, noise = 300, 2e-4, 0.01
	centre := []float64{414, 474}
	_, truth := mixture(nil, centre, sd, 1)
	rnd := rand.New(rand.NewPCG(31, 1))
	var with, without int
	for i := range n {
		set := *truth
		set.Components = slices.Clone(truth.Components)
		var moves [][2]int // component and emission whose loading is off by one standard error
		for f, c := range truth.Components {
			em, u := slices.Clone(c.Em), make([]float64, len(c.Em))
			for k := range em {
				if em[k] = max(0, em[k]+noise*rnd.NormFloat64()); em[k] > 0 {
					u[k] = noise
					moves = append(moves, [2]int{f, k})
				}
			}
			set.Components[f].Em, set.Components[f].EmU = em, u
		}
		src := &merit.Sources{Loadings: &merit.Loadings{Samples: len(moves), Move: func(l int) (ex, em [][]float64) {
			for range set.Components {
				ex, em = append(ex, make([]float64, len(truth.Components[0].Ex))), append(em, make([]float64, len(truth.Components[0].Em)))
			}
			em[moves[l][0]][moves[l][1]] = noise
			return ex, em
		}}}
		bare := *src
		for _, v := range []struct {
			src   *merit.Sources
			floor bool
			count *int
		}{{src, true, &with}, {&bare, false, &without}} {
			if !v.floor {
				for f := range set.Components {
					set.Components[f].EmU = nil // nothing to make the floor of
				}
			}
			c, _ := mixture([][]float64{{1, 0}}, centre, sd, uint64(i))
			_, sp := spreads(t, c, &set, v.src)
			at, _ := mixture([][]float64{{1, sp[0].Detection[1]}}, centre, sd, uint64(i))
			if r, sp := spreads(t, at, &set, v.src); r.Value[1] > sp[0].Critical[1] {
				*v.count++
			}
		}
	}
	t.Logf("at the detection limit %.1f %% detected, %.1f %% without the floor", 100*float64(with)/n, 100*float64(without)/n)
	// Standard errors of 1.5 %.
	if float64(with)/n < 0.92 || with <= without {
		t.Errorf("at the detection limit %.1f %% detected, %.1f %% without the floor", 100*float64(with)/n, 100*float64(without)/n)
	}
}
