package merit

import (
	"math"
	"runtime"
	"slices"
	"sync"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// search holds the residuals of the rows over their noise, on the cells of the
// model. The cells of one colour of a chequerboard come first, so that both halves
// and the whole are each one stretch.
type search struct {
	c      *eem.Cube
	r      *unmix.Resolution
	rows   []int
	cells  []int
	ja, ka []int32     // excitation and emission of each of cells
	res    [][]float64 // by row, cells long, in units of the row's noise; 0 where missing
	gaps   [][]int32   // by row: which of cells are missing
	w      []float64   // by cell: one over the variance of the residuals in those units
	a      []float64   // cells × n, the model
	n      int
	halves [2]*stretch
	whole  *stretch
}

// stretch is a part of the cells.
type stretch struct {
	from, to int
	inv      []float64 // (K'K)⁻¹ on them, nil where it does not exist
}

func (p *stretch) len() int { return p.to - p.from }

func newSearch(c *eem.Cube, r *unmix.Resolution, rows []int, spreads []Spread) *search {
	s := &search{c: c, r: r, n: r.Set.Len()}
	s.order()
	for _, row := range rows {
		if r.Fits[row].Usable && spreads[row].NoiseRMS > 0 {
			s.rows = append(s.rows, row)
		}
	}
	s.res, s.gaps = make([][]float64, len(s.rows)), make([][]int32, len(s.rows))
	s.each(func(from, to int) {
		dst := make([]float64, c.Cells())
		for i := from; i < to; i++ {
			row := s.rows[i]
			r.ResidualTo(dst, c.Sample(row), row)
			v, why := make([]float64, len(s.cells)), c.SampleWhy(row)
			for l, cell := range s.cells {
				if x := dst[cell]; why[cell] == eem.Measured && x == x {
					v[l] = x / spreads[row].NoiseRMS
				} else {
					s.gaps[i] = append(s.gaps[i], int32(l))
				}
			}
			s.res[i] = v
		}
	})
	s.weigh(spreads)
	return s
}

// order lists the cells of the model, those of one colour first.
func (s *search) order() {
	a, cells := s.r.Set.Matrix()
	nk := s.c.Em.Len()
	s.a = make([]float64, 0, len(a))
	for colour := range 2 {
		p := &stretch{from: len(s.cells)}
		for l, cell := range cells {
			if (cell/nk+cell%nk)%2 == colour {
				s.cells = append(s.cells, cell)
				s.ja, s.ka = append(s.ja, int32(cell/nk)), append(s.ka, int32(cell%nk))
				s.a = append(s.a, a[l*s.n:(l+1)*s.n]...)
			}
		}
		p.to = len(s.cells)
		s.halves[colour] = p
	}
	s.whole = &stretch{to: len(s.cells)}
	for _, p := range []*stretch{s.halves[0], s.halves[1], s.whole} {
		gram := make([]float64, s.n*s.n)
		for l := p.from; l < p.to; l++ {
			addOuter(gram, s.a[l*s.n:(l+1)*s.n], 1)
		}
		p.inv = inverse(gram, s.n, all(s.n))
	}
}

// block is how many rows are summed at a time: the sums do not depend on the number
// of workers.
const block = 32

// each calls do for every block of rows, several at a time.
func (s *search) each(do func(from, to int)) {
	next := make(chan int)
	var wg sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for from := range next {
				do(from, min(from+block, len(s.rows)))
			}
		})
	}
	for from := 0; from < len(s.rows); from += block {
		next <- from
	}
	close(next)
	wg.Wait()
}

// weigh sets the weights of the cells from the mean over the rows of their noise.
func (s *search) weigh(spreads []Spread) {
	s.w = make([]float64, len(s.cells))
	n := make([]float64, len(s.cells))
	for _, row := range s.rows {
		u := s.c.SampleU(row)
		for l, cell := range s.cells {
			if v := float64(u[cell]) / spreads[row].NoiseRMS; v > 0 {
				s.w[l], n[l] = s.w[l]+v*v, n[l]+1
			}
		}
	}
	for l, v := range s.w {
		if v > 0 {
			s.w[l] = n[l] / v
		}
	}
}

// crossed returns, by row, the smaller of the two Z of spectra made on one half of
// the cells and judged on the other; nil where none can exceed the limit.
func (s *search) crossed(limit float64) []float64 {
	out := slices.Repeat([]float64{math.Inf(1)}, len(s.rows))
	for colour := range 2 {
		ex, em, last := s.fit(s.halves[colour], s.start(s.halves[colour]))
		if last == nil {
			return nil
		}
		judge := s.halves[1-colour]
		_, p := s.template(ex, em, judge)
		y := s.yardstick(p, judge)
		for i := range out {
			out[i] = math.Min(out[i], s.amount(i, y)*math.Sqrt(s.information(i, y)))
		}
		if !(slices.Max(out) > limit) {
			return nil
		}
	}
	return out
}

// template is ex × em on a stretch, and what the model does not take of it:
// p = m − K(K'K)⁻¹K'm.
func (s *search) template(ex, em []float64, on *stretch) (m, p []float64) {
	m, km := make([]float64, on.len()), make([]float64, s.n)
	for q := range m {
		l := on.from + q
		m[q] = ex[s.ja[l]] * em[s.ka[l]]
		axpy(m[q], s.a[l*s.n:(l+1)*s.n], km)
	}
	p = slices.Clone(m)
	if on.inv == nil {
		return m, p
	}
	x := make([]float64, s.n)
	for f := range x {
		x[f] = floats.Dot(on.inv[f*s.n:(f+1)*s.n], km)
	}
	for q := range p {
		l := on.from + q
		for f, v := range x {
			p[q] -= v * s.a[l*s.n+f]
		}
	}
	return m, p
}

// yardstick measures amounts of a template that the model leaves: wp·v / Σwp².
type yardstick struct {
	on  *stretch
	wp  []float64
	p2  []float64 // w p² by cell
	sum float64   // of p2
}

func (s *search) yardstick(p []float64, on *stretch) *yardstick {
	y := &yardstick{on: on, wp: make([]float64, len(p)), p2: make([]float64, len(p))}
	for q, v := range p {
		y.wp[q] = s.w[on.from+q] * v
		y.p2[q] = y.wp[q] * v
		y.sum += y.p2[q]
	}
	return y
}

// information is one over the variance of the amount in row i by noise.
func (s *search) information(i int, y *yardstick) float64 {
	d := y.sum
	for _, l := range s.within(i, y.on) {
		d -= y.p2[int(l)-y.on.from]
	}
	if d <= 1e-9*y.sum {
		return 0
	}
	return d
}

// within are the gaps of row i on a stretch.
func (s *search) within(i int, on *stretch) []int32 {
	g := s.gaps[i]
	lo, _ := slices.BinarySearch(g, int32(on.from))
	hi, _ := slices.BinarySearch(g, int32(on.to))
	return g[lo:hi]
}

// amount is the least-squares amount of the template in row i, in units of its
// noise; 0 where its cells say nothing.
func (s *search) amount(i int, y *yardstick) float64 {
	d := s.information(i, y)
	if d == 0 {
		return 0
	}
	return floats.Dot(y.wp, s.res[i][y.on.from:y.on.to]) / d
}

// start is the map to start from: the mean of the residuals of the bottles that
// leave most, weighted by how much more than noise they leave.
func (s *search) start(on *stretch) []float64 {
	w := s.w[on.from:on.to]
	return s.sum(on, func(i int) float64 {
		ss := 0.0
		for q, v := range s.res[i][on.from:on.to] {
			ss += w[q] * v * v
		}
		x := math.Max(0, ss/math.Max(1, float64(on.len()-len(s.within(i, on))))-1)
		return x * x
	}).map1
}

func (s *search) factor(on *stretch, r, w []float64) *factor {
	f := &factor{s: s, on: on, r: r, w: w, gram: make([]float64, s.n*s.n), kr: make([]float64, s.n)}
	for q, v := range w {
		k := f.row(q)
		addOuter(f.gram, k, v)
		axpy(v*r[q], k, f.kr)
	}
	return f
}
