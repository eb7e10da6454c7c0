package merit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
)

// rowSums are weighted sums over the rows.
type rowSums struct {
	map1   []float64 // Σ a·residual by cell
	square float64   // Σ a²
	less   []float64 // Σ a² of the rows that lack the cell; nil where none lacks any
}

// sum adds up the rows times what of gives each. Blocks are added in order.
func (s *search) sum(on *stretch, of func(i int) float64) rowSums {
	blocks := make([]rowSums, (len(s.rows)+block-1)/block)
	s.each(func(from, to int) {
		b := &blocks[from/block]
		for i := from; i < to; i++ {
			a := of(i)
			if a <= 0 {
				continue
			}
			if b.map1 == nil {
				b.map1 = make([]float64, on.len())
			}
			floats.AddScaled(b.map1, a, s.res[i][on.from:on.to])
			b.square += a * a
			for _, l := range s.within(i, on) {
				if b.less == nil {
					b.less = make([]float64, on.len())
				}
				b.less[int(l)-on.from] += a * a
			}
		}
	})
	out := rowSums{map1: make([]float64, on.len()), less: make([]float64, on.len())}
	for _, b := range blocks {
		out.square += b.square
		if b.map1 != nil {
			floats.Add(out.map1, b.map1)
		}
		if b.less != nil {
			floats.Add(out.less, b.less)
		}
	}
	return out
}

// fit alternates amounts and spectra: with the amounts a that rows show of a template,
// the mean of their residuals over a is the template less what the model takes of it,
// and the next template is the non-negative ex × em that fits this best beside any
// amounts of the model. It stops where no loading moves by more than settled, and
// returns the last such fit; nil where nothing positive is left.
func (s *search) fit(on *stretch, from []float64) (ex, em []float64, last *factor) {
	const rounds, settled = 60, 1e-6
	f := s.factor(on, from, s.w[on.from:on.to])
	f.ridge = seen * f.largest()
	ex, em = f.flat()
	for range 30 {
		f.step(ex, em)
	}
	for range rounds {
		if slices.Max(ex) == 0 || slices.Max(em) == 0 {
			return ex, em, nil
		}
		_, p := s.template(ex, em, on)
		y := s.yardstick(p, on)
		sums := s.sum(on, func(i int) float64 { return s.amount(i, y) })
		w := make([]float64, on.len())
		for q := range w {
			if weight := sums.square - sums.less[q]; weight > 1e-9*sums.square {
				w[q] = s.w[on.from+q] * weight
				sums.map1[q] /= weight
			}
		}
		f = s.factor(on, sums.map1, w)
		f.ridge = 1 / (largestLoading * largestLoading)
		oldEx, oldEm := slices.Clone(ex), slices.Clone(em)
		for range 3 {
			f.step(ex, em)
		}
		if floats.Distance(ex, oldEx, math.Inf(1)) < settled && floats.Distance(em, oldEm, math.Inf(1)) < settled {
			break
		}
	}
	return ex, em, f
}

const (
	// seen is the share of the best-seen loading's information that halves a loading
	// of the first guess: those that hardly any cell shows would be noise over nothing.
	seen = 0.02
	// largestLoading is what a loading may be before anything is measured, a standard
	// deviation: those that hardly any cell shows stay small.
	largestLoading = 0.2
	// likeliest is how much of a component of the model an unknown looks like before
	// anything is measured, a standard deviation, its own size being 1: of two mixtures
	// that differ by noise the one that needs less of the model is taken.
	likeliest = 1
)

// factor fits a map on a stretch by ex × em beside the model, by least squares with
// the weights w, one over variances.
type factor struct {
	s     *search
	on    *stretch
	r, w  []float64
	gram  []float64 // K'WK
	kr    []float64 // K'Wr
	ridge float64
}

// row is the model in cell q of the stretch.
func (f *factor) row(q int) []float64 {
	l := f.on.from + q
	return f.s.a[l*f.s.n : (l+1)*f.s.n]
}

func (f *factor) flat() (ex, em []float64) {
	return slices.Repeat([]float64{1}, f.s.c.Ex.Len()), slices.Repeat([]float64{1}, f.s.c.Em.Len())
}

// largest is the largest information on a loading of either mode with the other flat.
func (f *factor) largest() float64 {
	den := make([]float64, f.s.c.Ex.Len())
	for q, v := range f.w {
		den[f.s.ja[f.on.from+q]] += v
	}
	return slices.Max(den)
}

// step replaces ex, given em, and then em, given the new ex.
func (f *factor) step(ex, em []float64) {
	ja, ka := f.s.ja[f.on.from:f.on.to], f.s.ka[f.on.from:f.on.to]
	f.mode(ex, em, ja, ka)
	f.mode(em, ex, ka, ja)
}

// loadings are the spectra with what the cells know of each of their wavelengths, the
// other spectrum as it is.
func (f *factor) loadings(ex, em []float64) (x, m *loading) {
	x = &loading{v: ex, info: make([]float64, len(ex)), ridge: f.ridge}
	m = &loading{v: em, info: make([]float64, len(em)), ridge: f.ridge}
	for q, w := range f.w {
		j, k := f.s.ja[f.on.from+q], f.s.ka[f.on.from+q]
		x.info[j] += w * em[k] * em[k]
		m.info[k] += w * ex[j] * ex[j]
	}
	return x, m
}

// size is the information in ex × em: its square over the variance of the noise.
func (f *factor) size(dst, other []float64, at, across []int32) float64 {
	sum := 0.0
	for q, w := range f.w {
		m := dst[at[q]] * other[across[q]]
		sum += w * m * m
	}
	return sum
}

// mode replaces the loadings dst of one mode, not below 0 and at a maximum of 1, by
// those that fit best together with the amounts y of the model:
//
//	D·dst + B'y = num,  B·dst + (K'WK)y = K'Wr
//
// with D diagonal, so that only the model's own few equations are solved.
func (f *factor) mode(dst, other []float64, at, across []int32) {
	n := f.s.n
	num, den, b := make([]float64, len(dst)), slices.Repeat([]float64{f.ridge}, len(dst)), make([]float64, len(dst)*n)
	for q, w := range f.w {
		if v := w * other[across[q]]; v != 0 {
			i := int(at[q])
			num[i] += v * f.r[q]
			den[i] += v * other[across[q]]
			axpy(v, f.row(q), b[i*n:(i+1)*n])
		}
	}
	s, rhs := slices.Clone(f.gram), slices.Clone(f.kr)
	for i, d := range den {
		if d > 0 {
			addOuter(s, b[i*n:(i+1)*n], -1/d)
			axpy(-num[i]/d, b[i*n:(i+1)*n], rhs)
		}
	}
	size := f.size(dst, other, at, across)
	for h := range n {
		s[h*n+h] += f.gram[h*n+h] * (1e-9 + 1/(likeliest*likeliest*size))
	}
	y := make([]float64, n)
	if inv := inverse(s, n, all(n)); inv != nil {
		for h := range y {
			y[h] = floats.Dot(inv[h*n:(h+1)*n], rhs)
		}
	}
	for i, d := range den {
		dst[i] = 0
		if d > 0 {
			dst[i] = math.Max(0, (num[i]-floats.Dot(b[i*n:(i+1)*n], y))/d)
		}
	}
	if top := slices.Max(dst); top > 0 {
		floats.Scale(1/top, dst)
	}
}
