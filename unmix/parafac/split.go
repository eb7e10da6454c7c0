package parafac

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sort"
	"strings"

	"tarnlight/eem"
)

func shuffled(n int, seed uint64) []int { return rand.New(rand.NewPCG(seed, 2<<32)).Perm(n) }

// halving is one way to cut the samples in two. The halves' data never saw each
// other: with one basis for both, their difference was a quarter of the true
// error at 1,000 samples (NUMERICS 2g).
type halving struct {
	name   string
	rows   [2][]int
	data   [2]*data
	column bool // by a column: told, not judged
}

// halvings lists the random splits, which recombine the quarters, the
// alternating one, and one for each column.
func (pr *prepared) halvings(ctx context.Context, groups [][]int, sp *Splits, set *Settings) ([]*halving, error) {
	var out []*halving
	for n, q := range [][4]int{{0, 1, 2, 3}, {0, 2, 1, 3}, {0, 3, 1, 2}} {
		h := &halving{name: fmt.Sprintf("random %d", n+1)}
		for side := range 2 {
			a, b := q[2*side], q[2*side+1]
			h.rows[side] = merged(pr.quarter[a], pr.quarter[b])
			if pr.part != nil {
				h.data[side] = pr.halfOf(set, h.rows[side], pr.part[a], pr.part[b])
			}
		}
		out = append(out, h)
	}
	alt := &halving{name: "alternating"}
	for n, g := range groups {
		alt.rows[n%2] = append(alt.rows[n%2], g...)
	}
	out = append(out, alt)
	for _, by := range sp.By {
		if h := pr.byColumn(by); h != nil {
			out = append(out, h)
		}
	}
	for _, h := range out {
		for side := range 2 {
			slices.Sort(h.rows[side])
		}
	}
	return out, pr.compressHalves(ctx, out, set)
}

func merged(a, b []int) []int {
	m := slices.Concat(a, b)
	slices.Sort(m)
	return m
}

// halfOf is the data of two quarters, compressed once more together.
func (pr *prepared) halfOf(set *Settings, rows []int, parts ...*basis) *data {
	sub := pr.subset(rows)
	var bases []*basis
	for _, b := range parts {
		c := *b
		c.samples = make([]int, len(b.samples))
		for n, i := range b.samples {
			c.samples[n], _ = slices.BinarySearch(rows, i)
		}
		bases = append(bases, &c)
	}
	beside := sub.beside(bases)
	return sub.stacked([]*basis{merge(bases, basisRank, set.Seed)}, beside)
}

// beside lists the rows that no basis holds.
func (p *problem) beside(bases []*basis) []int {
	in := make([]bool, p.i)
	for _, b := range bases {
		for _, i := range b.samples {
			in[i] = true
		}
	}
	var out []int
	for i, ok := range in {
		if !ok {
			out = append(out, i)
		}
	}
	return out
}

// compressHalves makes the data of halves that are not made of quarters.
func (pr *prepared) compressHalves(ctx context.Context, hs []*halving, set *Settings) error {
	return parallel(ctx, set, 2*len(hs), "halves", func(n int) error {
		h, side := hs[n/2], n%2
		if h.data[side] != nil {
			return nil
		}
		sub := pr.subset(h.rows[side])
		if pr.part == nil || sub.i < compressFrom {
			h.data[side] = sub.whole()
			return nil
		}
		rows := sub.x
		var whole, beside, at []int
		for i := range sub.i {
			if len(pr.gaps[h.rows[side][i]]) > 0 && !pr.filled {
				beside = append(beside, i)
			} else {
				whole = append(whole, i)
			}
		}
		if pr.filled {
			rows = nil
			for _, i := range h.rows[side] {
				rows = append(rows, pr.full[i])
			}
		}
		var x [][]float64
		for _, i := range whole {
			x, at = append(x, rows[i]), append(at, i)
		}
		h.data[side] = sub.stacked([]*basis{compress(x, at, basisRank, set.Seed)}, beside)
		return nil
	})
}

// byColumn parts the samples by the values of a column, so that the halves are
// as equal as can be; nil when it has fewer than two values.
func (pr *prepared) byColumn(by SplitBy) *halving {
	of := make(map[string][]int)
	for row, i := range pr.sample {
		if v := by.Value[i]; v != "" {
			of[v] = append(of[v], row)
		}
	}
	if len(of) < 2 {
		return nil
	}
	values := make([]string, 0, len(of))
	for v := range of {
		values = append(values, v)
	}
	sort.Strings(values)
	slices.SortStableFunc(values, func(a, b string) int { return len(of[b]) - len(of[a]) })
	h := &halving{column: true}
	var names [2][]string
	for _, v := range values {
		side := 0
		if len(h.rows[1]) < len(h.rows[0]) {
			side = 1
		}
		h.rows[side] = append(h.rows[side], of[v]...)
		names[side] = append(names[side], v)
	}
	h.name = fmt.Sprintf("%s: %s against %s", by.Name, some(names[0]), some(names[1]))
	return h
}

func some(names []string) string {
	sort.Strings(names)
	if len(names) > 4 {
		return fmt.Sprintf("%s and %d more", strings.Join(names[:3], ", "), len(names)-3)
	}
	return strings.Join(names, ", ")
}

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
		out = append(out, s)
	}
	return out, nil
}

// fitHalf fits one half from the whole survey's model and from two random
// starts, and takes the best.
func (pr *prepared) fitHalf(ctx context.Context, m *model, d *data, set *Settings) (*als, error) {
	var best *als
	for start := range 3 {
		s := newALS(d, m.s.f, set)
		if start == 0 {
			copy(s.b, m.s.b)
			copy(s.c, m.s.c)
			s.hold(set.Hold)
			s.scores()
		} else {
			s.random(set.Seed, start-1, set.Hold)
		}
		if _, err := s.iterate(ctx, set.Tol, screenIter); err != nil {
			return nil, err
		}
		if best == nil || s.loss < best.loss {
			best = s
		}
	}
	if _, err := best.iterate(ctx, set.Tol, screenIter); err != nil {
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

// compare returns the congruence of two loadings where ok, and by how much peak
// and centroid, nm, moved from x to y.
func compare(axis eem.Axis, x, y []float64, ok []bool) (congruence, peak, centre float64) {
	x, y = only(x, ok), only(y, ok)
	return Congruence(x, y), axis.At(peakAt(y)) - axis.At(peakAt(x)), centroid(axis, y) - centroid(axis, x)
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
