package plan

import (
	"context"
	"math"
	"runtime"
	"slices"
	"sync"

	"gonum.org/v1/gonum/floats"
)

// found is the best choice of one part of the search.
type found struct {
	lines []int
	cost  float64
}

// exhaustive tries all choices of n lines, those that share their first one on one
// goroutine.
func (d *Design) exhaustive(ctx context.Context, n int, s *Settings) ([]int, float64, error) {
	if n == len(s.Must) {
		w := d.worker()
		w.set(s.Must)
		return sorted(s.Must), w.cost(), nil
	}
	var free []int
	for _, j := range d.use {
		if !slices.Contains(s.Must, j) {
			free = append(free, j)
		}
	}
	best := found{cost: math.Inf(1)}
	for _, r := range d.everyFirst(ctx, n, free, s) {
		if r.lines != nil && better(r.cost, r.lines, best.cost, best.lines) {
			best = r
		}
	}
	return best.lines, best.cost, ctx.Err()
}

// everyFirst gives the best choice for each first line of free.
func (d *Design) everyFirst(ctx context.Context, n int, free []int, s *Settings) []found {
	workers := s.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	out := make([]found, len(free))
	var wg sync.WaitGroup
	next := make(chan int)
	for range workers {
		wg.Go(func() {
			t := d.tree(n, free, s.Must)
			for first := range next {
				if ctx.Err() == nil {
					out[first].lines, out[first].cost = t.from(first)
				}
			}
		})
	}
	for first := range free {
		next <- first
	}
	close(next)
	wg.Wait()
	return out
}

// tree walks over all choices, with the sums of every depth kept.
type tree struct {
	*worker
	n           int
	free        []int
	must        []int
	sumG, sumN  [][]float64 // by depth
	lines, best []int       // lines: those that must be in it, then one a depth
	least       float64
}

func (d *Design) tree(n int, free, must []int) *tree {
	t := &tree{worker: d.worker(), n: n - len(must), free: free, must: must}
	t.set(must)
	for range t.n + 1 {
		t.sumG, t.sumN = append(t.sumG, slices.Clone(t.gram)), append(t.sumN, slices.Clone(t.noise))
	}
	t.lines = append(slices.Clone(must), make([]int, t.n)...)
	return t
}

// from returns the best choice whose first free line is number first.
func (t *tree) from(first int) ([]int, float64) {
	t.best, t.least = nil, math.Inf(1)
	t.walk(0, first, first+1)
	return t.best, t.least
}

// walk sets the line of a depth to each of free[lo:hi] in turn.
func (t *tree) walk(depth, lo, hi int) {
	for i := lo; i < hi; i++ {
		j := t.free[i]
		at := len(t.must) + depth
		t.lines[at] = j
		if depth+1 == t.n {
			if c := t.with(t.lines[:at], t.sumG[depth], t.sumN[depth], j); c < t.least {
				t.least, t.best = c, sorted(t.lines)
			}
			continue
		}
		floats.AddTo(t.sumG[depth+1], t.sumG[depth], t.d.lines[j].gram)
		floats.AddTo(t.sumN[depth+1], t.sumN[depth], t.d.lines[j].noise)
		t.walk(depth+1, i+1, len(t.free))
	}
}
