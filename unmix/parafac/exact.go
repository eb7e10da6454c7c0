package parafac

import "math"

// exactScores solves for a, given b and c, to the last digit and sets loss.
func (s *als) exactScores() {
	s.modelRows()
	s.products()
	s.ridgeA()
	f := s.f
	s.loss = s.x2
	g := make([]float64, f*f)
	for i := range s.i {
		s.gramTo(g, i)
		if s.free {
			s.solveFree(s.a[i*f:(i+1)*f], g, s.m[i*f:(i+1)*f], s.lam, nil, 0)
		} else {
			solveNNLS(s.a[i*f:(i+1)*f], g, s.m[i*f:(i+1)*f], s.lam)
		}
		s.addLoss(i, g)
	}
}

// solveNNLS minimises ½ v'(h+Λ)v − q'v over v ≥ 0 by an active set (Lawson &
// Hanson 1974, ch. 23), for the few columns of a model.
func solveNNLS(v, h, q, lam []float64) {
	f := len(v)
	passive := make([]bool, f)
	clear(v)
	for range 3 * f {
		best, most := -1, 0.0
		for x := range f {
			if passive[x] {
				continue
			}
			g := q[x] - lam[x]*v[x]
			for y := range f {
				g -= h[x*f+y] * v[y]
			}
			d := math.Sqrt(h[x*f+x] + lam[x])
			if d > 0 && g > most*d && g > 1e-13*math.Abs(q[x]) {
				best, most = x, g/d
			}
		}
		if best < 0 {
			return
		}
		passive[best] = true
		if !stepPassive(v, h, q, lam, passive) {
			passive[best] = false
			return
		}
	}
}

// stepPassive moves v to the optimum of the passive columns, dropping those that
// would go negative on the way. It says false where the columns depend on each
// other.
func stepPassive(v, h, q, lam []float64, passive []bool) bool {
	f := len(v)
	idx, l, t := make([]int, 0, f), make([]float64, f*f), make([]float64, f)
	for {
		idx = idx[:0]
		for x, p := range passive {
			if p {
				idx = append(idx, x)
			}
		}
		n := len(idx)
		for a, x := range idx {
			t[a] = q[x]
			for b, y := range idx {
				l[a*n+b] = h[x*f+y]
			}
			l[a*n+a] += lam[x]
		}
		if !cholesky(l, n, 1e-14) {
			return false
		}
		solveCholesky(l, t, n)
		step, stop := 1.0, -1
		for a, x := range idx {
			if t[a] <= 0 {
				if u := v[x] / (v[x] - t[a]); stop < 0 || u < step {
					step, stop = u, x
				}
			}
		}
		for a, x := range idx {
			v[x] = math.Max(0, v[x]+step*(t[a]-v[x]))
		}
		if stop < 0 {
			return true
		}
		v[stop], passive[stop] = 0, false
	}
}
