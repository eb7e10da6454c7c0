package parafac

import "math"

// als holds one start: factors and the work space of its updates.
type als struct {
	*data
	f            int
	free         bool // no sign constraint
	eps          float64
	a, b, c      []float64
	fixB, fixC   []bool    // entries that updates leave alone (held); nil: none
	dampB, dampC []bool    // entries the ridge stays on; nil: all, as at the start
	kt           []float64 // F × P: model rows, weighted
	z            []float64 // F × P: A'X
	zc           []float64 // P × F: the same, weighted
	m            []float64 // I × F: X·K
	rk, coef     []float64 // (r+raw) × F
	part         []float64 // scratch of a basis: scores, and F × r
	col          []float64 // K: one column of c
	ga, gk, gap  []float64
	hs, qs       []float64          // normal equations of one mode
	pair         []float64          // J + K: product of two columns, and its sums
	h, q, inv    []float64          // one row's
	lam          []float64          // F: ridge on the columns of the mode in work, and
	lamDamped    []float64          // F: what is added to it on damped entries
	loss         float64            // penalised, after the last update of a
	trace        func(loss float64) // told every accepted loss, for tests
	iter         int
	revived      int
}

func newALS(d *data, f int, s *Settings) *als {
	n, long, r := d.r+len(d.raw), max(d.j, d.k), 0
	for _, b := range d.bases {
		r = max(r, len(b.rows))
	}
	return &als{
		data: d, f: f, free: s.Unconstrained, eps: energyRidge,
		a: make([]float64, d.i*f), b: make([]float64, d.j*f), c: make([]float64, d.k*f),
		kt: make([]float64, f*d.p), z: make([]float64, f*d.p), zc: make([]float64, f*d.p), m: make([]float64, d.i*f),
		rk: make([]float64, n*f), coef: make([]float64, n*f), part: make([]float64, (d.i+r)*f), col: make([]float64, d.k),
		ga: make([]float64, f*f), gk: make([]float64, f*f), gap: make([]float64, len(d.gapCell)*f*f),
		hs: make([]float64, long*f*f), qs: make([]float64, long*f), pair: make([]float64, d.j+d.k),
		h: make([]float64, f*f), q: make([]float64, f), inv: make([]float64, f),
		lam: make([]float64, f), lamDamped: make([]float64, f),
	}
}

// modelRows sets kt to the weighted Khatri–Rao rows of the cells and gk to their
// Gram matrix.
func (s *als) modelRows() {
	col := s.col
	for f := range s.f {
		for k := range col {
			col[k] = s.c[k*s.f+f]
		}
		kt := s.kt[f*s.p : (f+1)*s.p]
		for j := range s.j {
			b := s.b[j*s.f+f]
			for q := s.byEx[j]; q < s.byEx[j+1]; q++ {
				kt[q] = s.w[q] * b * col[s.ck[q]]
			}
		}
	}
	for f := range s.f {
		for g := f; g < s.f; g++ {
			s.gk[f*s.f+g] = dot(s.kt[f*s.p:(f+1)*s.p], s.kt[g*s.p:(g+1)*s.p])
		}
	}
	mirror(s.gk, s.f)
}

// updateA solves for the scores by sweeps from the present ones and sets loss.
func (s *als) updateA(sweeps int) {
	s.modelRows()
	s.products()
	f := s.f
	s.ridgeA()
	s.loss = s.x2
	if s.free {
		for _, i := range s.complete {
			s.solveRow(s.a[i*f:(i+1)*f], s.gk, s.m[i*f:(i+1)*f], s.lam, nil, 0, sweeps)
			s.addLoss(i, s.gk)
		}
	} else {
		s.sweepTogether(s.complete, sweeps)
	}
	g := make([]float64, f*f)
	for _, i := range s.raw {
		if len(s.gaps[i]) > 0 {
			s.gramTo(g, i)
			s.solveRow(s.a[i*f:(i+1)*f], g, s.m[i*f:(i+1)*f], s.lam, nil, 0, sweeps)
			s.addLoss(i, g)
		}
	}
}

// addLoss adds the part of the loss of sample i, whose Gram matrix is g.
func (s *als) addLoss(i int, g []float64) {
	f := s.f
	a, m := s.a[i*f:(i+1)*f], s.m[i*f:(i+1)*f]
	for x := range f {
		v := -2 * m[x]
		for y, gv := range g[x*f : (x+1)*f] {
			v += gv * a[y]
		}
		s.loss += a[x] * (v + s.lam[x]*a[x])
	}
}

// gramTo writes the Gram matrix of the cells that sample i has.
func (s *als) gramTo(g []float64, i int) {
	copy(g, s.gk)
	f := s.f
	for _, q := range s.gaps[i] {
		for x := range f {
			v := s.kt[x*s.p+int(q)]
			for y := x; y < f; y++ {
				g[x*f+y] -= v * s.kt[y*s.p+int(q)]
			}
		}
	}
	mirror(g, f)
}

// products sets m = X·K.
func (s *als) products() {
	f := s.f
	rowsTimesTo(s.rk, s.rows, s.kt, f)
	for n, b := range s.bases { // m = U·(R·K)
		r := len(b.rows)
		rkt, m := s.part[:f*r], s.part[f*r:]
		for q := range r {
			for x := range f {
				rkt[x*r+q] = s.rk[(s.at[n]+q)*f+x]
			}
		}
		rowsTimesTo(m, b.u, rkt, f)
		for q, i := range b.samples {
			copy(s.m[i*f:(i+1)*f], m[q*f:])
		}
	}
	for n, i := range s.raw {
		copy(s.m[i*f:(i+1)*f], s.rk[(s.r+n)*f:])
	}
}

// residualTo writes the weighted, scaled residual of sample i at its cells. The
// model rows must be up to date.
func (s *als) residualTo(r []float64, i int) {
	copy(r, s.x[i])
	for f := range s.f {
		if a := s.a[i*s.f+f]; a != 0 {
			axpy(-a, s.kt[f*s.p:(f+1)*s.p], r)
		}
	}
	for _, q := range s.gaps[i] {
		r[q] = 0
	}
}

// residualOf returns the same.
func (s *als) residualOf(i int) []float64 {
	r := make([]float64, s.p)
	s.residualTo(r, i)
	return r
}

// project prepares the updates of b and c: z = A'X, the Gram matrix of a, and
// for each cell with gaps the part of it that is not there.
func (s *als) project() {
	f := s.f
	clear(s.coef)
	for n, b := range s.bases { // (A'U)·R
		r := len(b.rows)
		coef, a := s.part[:f*r], s.part[f*r:]
		for q, i := range b.samples {
			copy(a[q*f:(q+1)*f], s.a[i*f:])
		}
		clear(coef)
		addTransposed(coef, a, b.u, f)
		for q := range r {
			for x := range f {
				s.coef[(s.at[n]+q)*f+x] = coef[x*r+q]
			}
		}
	}
	for n, i := range s.raw {
		copy(s.coef[(s.r+n)*f:(s.r+n+1)*f], s.a[i*f:])
	}
	clear(s.z)
	addTransposed(s.z, s.coef, s.rows, f)
	for x := range f {
		for q, v := range s.z[x*s.p : (x+1)*s.p] {
			s.zc[q*f+x] = s.w[q] * v
		}
	}
	gramTo(s.ga, s.a, s.i, f)
	clear(s.gap)
	for n := range s.gapCell {
		g := s.gap[n*f*f : (n+1)*f*f]
		for _, i := range s.gapOf[n] {
			a := s.a[int(i)*f : (int(i)+1)*f]
			for x, v := range a {
				axpy(v, a, g[x*f:(x+1)*f])
			}
		}
	}
}

// updateB and updateC solve for one row of loadings after the other.
func (s *als) updateB(sweeps int) {
	s.ridgeB()
	hs, qs := s.normal(s.modeB())
	s.updateRows(s.b, hs, qs, s.fixB, s.dampB, sweeps)
}

func (s *als) updateC(sweeps int) {
	s.ridgeC()
	hs, qs := s.normal(s.modeC())
	s.updateRows(s.c, hs, qs, s.fixC, s.dampC, sweeps)
}

func (s *als) updateRows(x, hs, qs []float64, fixed, damped []bool, sweeps int) {
	lam, f := make([]float64, s.f), s.f
	for at := 0; at < len(x); at += f {
		s.rowRidge(lam, damped, at)
		s.solveRow(x[at:at+f], hs[at*f:(at+f)*f], qs[at:at+f], lam, fixed, at, sweeps)
	}
}

// unit brings the columns of b and c to unit norm and their scale into a.
func (s *als) unit() {
	for f := range s.f {
		t := 1.0
		for _, m := range []struct {
			v []float64
			n int
		}{{s.b, s.j}, {s.c, s.k}} {
			n := math.Sqrt(columnSquare(m.v, m.n, s.f, f))
			if n == 0 {
				continue
			}
			t *= n
			for i := range m.n {
				m.v[i*s.f+f] /= n
			}
		}
		for i := range s.i {
			s.a[i*s.f+f] *= t
		}
	}
}
