package parafac

import (
	"context"
	"slices"
)

// prepared is a problem ready to be fitted: quarters of the samples compressed
// by themselves, so that halves can be made of them that have never seen each
// other, and all of them together.
type prepared struct {
	*problem
	all     *data
	quarter [][]int     // rows of each quarter
	part    []*basis    // nil where nothing was compressed
	full    [][]float64 // where filled: the samples with their gaps filled
	filled  bool        // gaps hold modelled values: the end must be on the samples
}

// prepare compresses. Samples with gaps stay beside the basis while they are
// few; when they are many their gaps are filled from a model of the others.
func (p *problem) prepare(ctx context.Context, f int, quarter [][]int, set *Settings) (*prepared, error) {
	pr := &prepared{problem: p, quarter: quarter}
	if p.i < compressFrom {
		pr.all = p.whole()
		return pr, nil
	}
	gappy := p.gappy()
	if len(gappy) <= basisRank {
		return pr, pr.compress(ctx, p.x, gappy, set)
	}
	fill, err := p.filler(ctx, f, set)
	if err != nil {
		return nil, err
	}
	return pr, pr.fill(ctx, fill, set)
}

// gappy lists the samples with gaps.
func (p *problem) gappy() []int {
	var out []int
	for i, g := range p.gaps {
		if len(g) > 0 {
			out = append(out, i)
		}
	}
	return out
}

// compress sets the bases from rows x, all samples but those in beside.
func (pr *prepared) compress(ctx context.Context, x [][]float64, beside []int, set *Settings) error {
	pr.part = make([]*basis, len(pr.quarter))
	err := parallel(ctx, set, len(pr.quarter), "compressing", func(n int) error {
		var rows [][]float64
		var samples []int
		for _, i := range pr.quarter[n] {
			if _, apart := slices.BinarySearch(beside, i); !apart {
				rows, samples = append(rows, x[i]), append(samples, i)
			}
		}
		pr.part[n] = compress(rows, samples, basisRank, set.Seed+uint64(n))
		return nil
	})
	if err != nil {
		return err
	}
	pr.all = pr.stacked([]*basis{merge(pr.part, basisRank, set.Seed)}, beside)
	return nil
}

// fill compresses with the gaps filled by the model s.
func (pr *prepared) fill(ctx context.Context, s *als, set *Settings) error {
	x := slices.Clone(pr.x)
	s.modelRows()
	for i, gaps := range pr.gaps {
		if len(gaps) == 0 {
			continue
		}
		x[i] = slices.Clone(x[i])
		for _, q := range gaps {
			for f := range s.f {
				x[i][q] += s.a[i*s.f+f] * s.kt[f*s.p+int(q)]
			}
		}
	}
	pr.filled, pr.full = true, x
	return pr.compress(ctx, x, nil, set)
}

// filler fits the samples without gaps, or where they are few the hundred with
// the fewest, and scores all samples on their own cells.
func (p *problem) filler(ctx context.Context, f int, set *Settings) (*als, error) {
	order := make([]int, p.i)
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return len(p.gaps[a]) - len(p.gaps[b]) })
	n := p.i - len(p.gappy())
	n = max(n, 100)
	base := p.subset(order[:n])
	few := *set
	few.Starts = min(set.Starts, 3)
	d := base.whole()
	if n >= compressFrom && len(base.gappy()) == 0 {
		all := make([]int, n)
		for i := range all {
			all[i] = i
		}
		d = base.stacked([]*basis{compress(base.x, all, basisRank, set.Seed)}, nil)
	}
	starts, err := runStarts(ctx, d, f, &few, nil)
	if err != nil {
		return nil, err
	}
	s := newALS(p.whole(), f, set)
	best := bestOf(starts).s
	copy(s.b, best.b)
	copy(s.c, best.c)
	s.exactScores()
	return s, nil
}

// alone makes every sample a group of its own, in random order.
func (p *problem) alone(seed uint64) (groups [][]int, order []int) {
	groups = make([][]int, p.i)
	for i := range groups {
		groups[i] = []int{i}
	}
	return groups, shuffled(p.i, seed)
}

// quarters deals the samples at random into four parts as equal as can be; what
// belongs to one group is never parted.
func quarters(groups [][]int, order []int) [][]int {
	out := make([][]int, 4)
	for _, g := range order {
		least := 0
		for q := range out {
			if len(out[q]) < len(out[least]) {
				least = q
			}
		}
		out[least] = append(out[least], groups[g]...)
	}
	for _, q := range out {
		slices.Sort(q)
	}
	return out
}
