package parafac

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"sort"
	"strings"
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
