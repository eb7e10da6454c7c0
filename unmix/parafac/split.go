package parafac

import (
	"context"
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
)

// splitAll fits the halves of every candidate that passes the cheap tests.
func (pr *prepared) splitAll(ctx context.Context, models []*model, groups [][]int, sp *Splits, set *Settings, ch *Choice) error {
	hs, err := pr.halvings(ctx, groups, sp, set)
	if err != nil {
		return err
	}
	type job struct {
		cand int
		h    *halving
		rows []Split
	}
	var jobs []*job
	for n, c := range ch.Candidates {
		if ok, _ := c.judge(); !ok && !c.unsplit() {
			continue
		}
		for _, h := range hs {
			if min(len(h.rows[0]), len(h.rows[1])) >= 2*c.Components {
				jobs = append(jobs, &job{cand: n, h: h})
			}
		}
	}
	err = parallel(ctx, set, len(jobs), "split halves", func(n int) (err error) {
		j := jobs[n]
		j.rows, err = pr.split(ctx, models[j.cand], j.h, set)
		return err
	})
	if err != nil {
		return err
	}
	least := make([][]float64, len(ch.Candidates))
	for _, j := range jobs {
		ch.Splits = append(ch.Splits, j.rows...)
		if j.h.column {
			continue
		}
		low := 1.0
		for _, r := range j.rows {
			low = math.Min(low, math.Min(r.Ex, r.Em))
		}
		least[j.cand] = append(least[j.cand], low)
	}
	for n, c := range ch.Candidates {
		c.tellHalves(least[n])
	}
	return nil
}

// unsplit says whether a candidate fails only for want of split halves.
func (c *Candidate) unsplit() bool {
	d := *c
	d.Halves, d.HalvesOK = 1, 1
	ok, _ := d.judge()
	return ok
}

func (c *Candidate) tellHalves(least []float64) {
	c.Halves = len(least)
	for _, v := range least {
		if v >= sameSpectrum {
			c.HalvesOK++
		}
	}
	if len(least) > 0 {
		sort.Float64s(least)
		c.LeastHalf = least[len(least)/2]
	}
}

// split fits both halves and compares them.
func (pr *prepared) split(ctx context.Context, m *model, h *halving, set *Settings) ([]Split, error) {
	var ex, em [2][][]float64
	for side := range 2 {
		s, err := pr.fitHalf(ctx, m, h.data[side], set)
		if err != nil {
			return nil, err
		}
		ex[side], em[side] = columns(s.b, s.j, s.f), columns(s.c, s.k, s.f)
	}
	var fullEx, fullEm [][]float64
	for f := range m.r.Components {
		fullEx, fullEm = append(fullEx, only(m.r.Ex[f], m.r.exRes[f])), append(fullEm, only(m.r.Em[f], m.r.emRes[f]))
	}
	a, b := Match(fullEx, fullEm, ex[0], em[0]), Match(fullEx, fullEm, ex[1], em[1])
	var out []Split
	for f := range m.r.Components {
		s := Split{Components: m.r.Components, Name: h.name, Component: f, First: len(h.rows[0]), Second: len(h.rows[1])}
		s.Ex, s.ExPeak, s.ExCentre = compare(pr.grid.Ex, ex[0][a[f].B], ex[1][b[f].B], m.r.exRes[f])
		s.Em, s.EmPeak, s.EmMean = compare(pr.grid.Em, em[0][a[f].B], em[1][b[f].B], m.r.emRes[f])
		s.Agrees = s.Ex >= sameSpectrum && s.Em >= sameSpectrum
		for side, n := range []int{a[f].B, b[f].B} {
			s.Spectra[side] = Spectra{Ex: maxOne(ex[side][n], m.r.ExDetermined[f]), Em: maxOne(em[side][n], m.r.EmDetermined[f])}
		}
		out = append(out, s)
	}
	return out, nil
}

// fitHalf fits one half from the whole survey's model. Two random starts beside it
// took two thirds of the time and changed no verdict on 24 surveys of 48 and 100
// bottles with three components: all halves of three agreed either way, and of the
// 192 splits of four and five components none did with them and two without.
func (pr *prepared) fitHalf(ctx context.Context, m *model, d *data, set *Settings) (*als, error) {
	best := newALS(d, m.s.f, set)
	copy(best.b, m.s.b)
	copy(best.c, m.s.c)
	best.hold(set.Hold)
	best.scores()
	if _, err := best.iterate(ctx, set.Tol, 2*screenIter); err != nil {
		return nil, err
	}
	if pr.filled { // what the whole survey's model put into the gaps must go
		s := newALS(d.problem.whole(), best.f, set)
		s.take(best)
		best = s
	}
	best.dampB, best.dampC = m.s.dampB, m.s.dampC
	_, err := best.iterate(ctx, set.Tol, polishIter)
	return best, err
}

// only returns v with what is not determined set to zero.
func only(v []float64, ok []bool) []float64 {
	out := slices.Clone(v)
	for i := range out {
		if !ok[i] {
			out[i] = 0
		}
	}
	return out
}

// maxOne returns v over its largest entry where ok, over its largest entry at all
// where that is zero.
func maxOne(v []float64, ok []bool) []float64 {
	out, top := slices.Clone(v), slices.Max(only(v, ok))
	if !(top > 0) {
		top = slices.Max(v)
	}
	if top > 0 {
		scaleBy(out, 1/top)
	}
	return out
}

// compare returns the congruence of two loadings where ok, and by how much peak
// and centroid, nm, moved from x to y.
func compare(axis eem.Axis, x, y []float64, ok []bool) (congruence, peak, centre float64) {
	x, y = only(x, ok), only(y, ok)
	return Congruence(x, y), axis.At(floats.MaxIdx(y)) - axis.At(floats.MaxIdx(x)), centroid(axis, y) - centroid(axis, x)
}

func centroid(axis eem.Axis, v []float64) float64 {
	var sum, at float64
	for i, x := range v {
		sum += x
		at += x * axis.At(i)
	}
	if sum == 0 {
		return 0
	}
	return at / sum
}
