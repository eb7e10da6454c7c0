package parafac

import (
	"math"
	"math/rand/v2"
)

// random sets b and c to uniform columns of unit norm, held ones apart, and a to
// the scores of that plus 0.1 % of their mean, so that none starts dead. The
// scale of the data is in the scores from the first step on: without that a
// ridge that is right for the data is wrong for the start.
func (s *als) random(seed uint64, start int, hold []Held) {
	rnd := rand.New(rand.NewPCG(seed, uint64(start)))
	for i := range s.b {
		s.b[i] = rnd.Float64()
	}
	for i := range s.c {
		s.c[i] = rnd.Float64()
	}
	if s.free {
		for _, x := range [][]float64{s.b, s.c} {
			for i := range x {
				x[i] -= 0.3
			}
		}
	}
	s.hold(hold)
	s.scores()
}

// without sets the factors to those of a model of one component more, with
// component drop left out.
func (s *als) without(above *als, drop int, hold []Held) {
	cut := func(dst, src []float64, n int) {
		for i := range n {
			to := 0
			for f := range above.f {
				if f != drop {
					dst[i*s.f+to] = src[i*above.f+f]
					to++
				}
			}
		}
	}
	cut(s.b, above.b, s.j)
	cut(s.c, above.c, s.k)
	s.hold(hold)
	s.scores()
}

// hold puts the known spectra into the first columns and fixes them.
func (s *als) hold(hold []Held) {
	if len(hold) == 0 {
		return
	}
	s.fixB, s.fixC = make([]bool, len(s.b)), make([]bool, len(s.c))
	for f, h := range hold {
		for j, v := range h.Ex {
			s.b[j*s.f+f], s.fixB[j*s.f+f] = v, true
		}
		for k, v := range h.Em {
			s.c[k*s.f+f], s.fixC[k*s.f+f] = v, true
		}
	}
}

// scores brings b and c to unit norm and solves for a from nothing.
func (s *als) scores() {
	clear(s.a)
	s.unit()
	clear(s.a)
	s.updateA(10 * innerSweeps)
	var mean float64
	for _, v := range s.a {
		mean += math.Abs(v)
	}
	mean /= float64(len(s.a))
	for i := range s.a {
		s.a[i] += 1e-3 * mean
	}
}

// revive gives a component that died, with energy below 1e-18 of the largest,
// the spectrum that the worst sample's residual asks for. It says whether it did.
func (s *als) revive() bool {
	e, most := make([]float64, s.f), 0.0
	for f := range e {
		e[f] = columnSquare(s.a, s.i, s.f, f) * columnSquare(s.b, s.j, s.f, f) * columnSquare(s.c, s.k, s.f, f)
		most = math.Max(most, e[f])
	}
	did := false
	for f := range e {
		if e[f] <= deadBelow*deadBelow*most && most > 0 && s.revived < 3*s.f {
			did = s.reviveColumn(f) || did
		}
	}
	return did
}

// reviveColumn sets column f to a rank-one fit of the positive residual of the
// sample with the most of it.
func (s *als) reviveColumn(f int) bool {
	s.revived++
	res, most := []float64(nil), 0.0
	s.modelRows()
	for i := range s.i {
		r := s.residualOf(i)
		for q, v := range r {
			if v < 0 && !s.free {
				r[q] = 0
			}
		}
		if ss := sumSquares(r); ss > most {
			res, most = r, ss
		}
	}
	if most == 0 {
		return false
	}
	b, c := s.rankOne(res)
	for j, v := range b {
		if s.fixB == nil || !s.fixB[j*s.f+f] {
			s.b[j*s.f+f] = v
		}
	}
	for k, v := range c {
		if s.fixC == nil || !s.fixC[k*s.f+f] {
			s.c[k*s.f+f] = v
		}
	}
	for i := range s.i {
		s.a[i*s.f+f] = 0
	}
	s.unit()
	s.updateA(innerSweeps)
	return true
}

// rankOne fits b·c' to one sample's cells by ten power steps.
func (s *als) rankOne(r []float64) (b, c []float64) {
	b, c = make([]float64, s.j), make([]float64, s.k)
	for k := range c {
		c[k] = 1
	}
	for range 10 {
		clear(b)
		for q, v := range r {
			b[s.cj[q]] += v * c[s.ck[q]]
		}
		clear(c)
		for q, v := range r {
			c[s.ck[q]] += v * b[s.cj[q]]
		}
		n := norm(c)
		if n == 0 {
			break
		}
		for k := range c {
			c[k] /= n
		}
	}
	return b, c
}
