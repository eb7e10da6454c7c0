package merit

import (
	"slices"

	"gonum.org/v1/gonum/stat/distuv"
)

// blanks adds the noise of the subtracted mean of blanks, less what standards with
// the same blanks share of it, and what the blanks' scatter shows beyond noise.
func (b *bottle) blanks() {
	e, n := b.e, b.e.n
	key := e.blankSet(b.i)
	d := slices.Index(e.blanks, key)
	a := e.factor(b.i)
	if d >= 0 {
		b.add("blank", "batch", 0, "noise of the mean of blanks", func(dst, x []float64) {
			axpy(a*a, b.m.b0[d], dst)
			if b.m.b1 == nil {
				return
			}
			for h := range n {
				for h2 := range h + 1 {
					v := form(b.m.b2[(h*n+h2)*n*n:], x)
					for g, y := range x {
						v -= 2 * a * y * b.m.b1[d][(h*n+h2)*n+g]
					}
					both(dst, n, h, h2, v)
				}
			}
		})
	} else if b.m.b2 != nil && len(e.blanks) > 0 {
		b.addTensor("blank", "batch", 0, "noise of the standards' blanks", b.m.b2)
	}
	if once, df := b.m.blankScatter(e, key); once != nil {
		m := slices.Clone(once)
		axpy(a*a-1, once, m)
		b.add("blank, beyond noise", "batch", df, "scatter of the blanks as the components see it", fixed(m))
	}
}

// blankScatter returns the covariance of K'(blank) that the scatter of a bottle's
// own blanks shows beyond their noise, for one measurement and the mean subtracted
// together; nil where noise explains it (F test at 1 %). Bottles that miss the same
// cells and have the same blanks share it.
func (m *mask) blankScatter(e *engine, key string) ([]float64, float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	s, ok := m.beyond[key]
	if !ok {
		s.cov, s.df = m.scatterOf(e, key)
		if m.beyond == nil {
			m.beyond = map[string]beyond{}
		}
		m.beyond[key] = s
	}
	return s.cov, s.df
}

func (m *mask) scatterOf(e *engine, key string) ([]float64, float64) {
	n := e.n
	if key == "" || e.src.Blank == nil {
		return nil, 0
	}
	scatter, noise := make([]float64, n*n), make([]float64, n*n)
	count := 0.0
	q := make([]float64, n)
	for i, blank := range e.src.Blank {
		u := e.c.SampleU(i)
		if !blank || e.blankSet(i) != key || u == nil {
			continue
		}
		count++
		clear(q)
		x := e.c.Sample(i)
		for _, l := range m.use {
			v, s := x[e.cells[l]], float64(u[e.cells[l]])
			if v != v || s != s {
				continue
			}
			axpy(v, e.row(l), q)
			addOuter(noise, e.row(l), s*s)
		}
		addOuter(scatter, q, 1)
	}
	if count < 2 {
		return nil, 0
	}
	limit := distuv.ChiSquared{K: count - 1}.Quantile(0.99) / (count - 1)
	out, more := make([]float64, n*n), false
	w := inverse(m.gram, n, all(n))
	if w == nil {
		return nil, 0
	}
	for h := range n {
		row := w[h*n : (h+1)*n]
		have, want := form(scatter, row)/(count-1), form(noise, row)/count
		more = more || have > limit*want
	}
	if !more {
		return nil, 0
	}
	for i := range out {
		out[i] = (scatter[i]/(count-1) - noise[i]/count) * (1 + 1/count)
	}
	return out, count - 1
}

// beyond is what blankScatter found of a set of blanks.
type beyond struct {
	cov []float64
	df  float64
}
