package merit_test

import (
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// bent makes a model of two overlapping components whose emission loadings are off by
// noise and then by a bias: where push is 0, the loss of the negative half of that
// noise; else push times the other component's spectrum. Sources know both.
func bent(centre []float64, noise, push float64, seed uint64) (*unmix.Set, *merit.Sources) {
	_, truth := mixture(nil, centre, 1, 1)
	rnd := rand.New(rand.NewPCG(31, seed))
	set := *truth
	set.Components = slices.Clone(truth.Components)
	flat := make([]float64, len(truth.Components[0].Ex))
	l := &merit.Loadings{}
	var moves [][2]int // component and emission whose loading is off by one standard error
	for f, c := range truth.Components {
		em, off := slices.Clone(c.Em), make([]float64, len(c.Em))
		for k := range em {
			is := em[k] + noise*rnd.NormFloat64()
			if push == 0 {
				off[k] = max(0, is) - is
			} else if f == 0 {
				off[k] = push * truth.Components[1].Em[k]
			}
			if em[k] = is + off[k]; push != 0 || em[k] > 0 {
				moves = append(moves, [2]int{f, k})
			}
		}
		set.Components[f].Em = em
		l.BentEx, l.BentEm = append(l.BentEx, flat), append(l.BentEm, off)
	}
	l.Samples = len(moves)
	l.Move = func(m int) (ex, em [][]float64) {
		for f := range set.Components {
			ex, em = append(ex, flat), append(em, make([]float64, len(set.Components[f].Em)))
		}
		em[moves[m][0]][moves[m][1]] = noise
		return ex, em
	}
	return &set, &merit.Sources{Loadings: l}
}

// blind are sources that do not know the bias.
func blind(src *merit.Sources) *merit.Sources {
	l := *src.Loadings
	l.BentEx, l.BentEm = nil, nil
	return &merit.Sources{Loadings: &l}
}

// Spectra that were resolved with noise and without negative loadings: where they are
// zero they are too high, so that a bottle's other component comes out too low. With
// that bias known nearly all bottles that hold the detection limit are detected; the
// covariance of the loadings alone promises far too little. (Not 95 %: here most
// loadings are zero in truth, and their covariance has lost its negative half too.)
func TestBoundsAtLimit(t *testing.T) {
	const n, sd, noise = 300, 2e-4, 0.01
	centre := []float64{414, 474}
	count := func(of func(*merit.Sources) *merit.Sources) (found int) {
		for i := range n {
			set, src := bent(centre, noise, 0, uint64(i))
			src = of(src)
			c, _ := mixture([][]float64{{1, 0}}, centre, sd, uint64(i))
			_, sp := spreads(t, c, set, src)
			at, _ := mixture([][]float64{{1, sp[0].Detection[1]}}, centre, sd, uint64(i))
			if r, sp := spreads(t, at, set, src); r.Value[1] > sp[0].Critical[1] {
				found++
			}
		}
		return found
	}
	with, without := count(func(s *merit.Sources) *merit.Sources { return s }), count(blind)
	t.Logf("at the detection limit %.1f %% detected, %.1f %% without the bias", 100*float64(with)/n, 100*float64(without)/n)
	// A standard error of 1.8 %.
	if float64(with)/n < 0.85 || without > with/2 {
		t.Errorf("at the detection limit %.1f %% detected, %.1f %% without the bias", 100*float64(with)/n, 100*float64(without)/n)
	}
}

// Where the loadings of one component have given way to the other, bottles without
// that one seem to hold some: the critical value knows, and 5 % are called detected.
// The same holds for a bottle that is resolved by the model's file.
func TestBoundsOfNothing(t *testing.T) {
	const n, sd, noise = 300, 2e-4, 0.002
	centre := []float64{440, 460}
	var with, without, filed int
	for i := range n {
		set, src := bent(centre, noise, -0.004, uint64(i))
		c, _ := mixture([][]float64{{1, 0}}, centre, sd, uint64(i))
		r, sp := spreads(t, c, set, src)
		_, bare := spreads(t, c, set, blind(src))
		frozen := *set
		frozen.Errors = merit.SpectraErrors(c, r, src, identity(c.Cells()))
		_, file := spreads(t, c, &frozen, nil)
		for _, v := range []struct {
			critical float64
			count    *int
		}{{sp[0].Critical[1], &with}, {bare[0].Critical[1], &without}, {file[0].Critical[1], &filed}} {
			if r.Value[1] > v.critical {
				*v.count++
			}
		}
	}
	t.Logf("%.1f %% of bottles without it detected, %.1f %% without the bias; by the model file %.1f %%", 100*float64(with)/n, 100*float64(without)/n, 100*float64(filed)/n)
	// A standard error of 1.3 %.
	if float64(with)/n > 0.09 || float64(with)/n < 0.01 || without < 2*with || filed != with {
		t.Errorf("%.1f %% of bottles without it detected, %.1f %% without the bias; by the model file %.1f %%", 100*float64(with)/n, 100*float64(without)/n, 100*float64(filed)/n)
	}
}

func identity(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}
