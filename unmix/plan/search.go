package plan

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/stat/combin"
)

// Settings of a search. The zero value works.
type Settings struct {
	Must   []int  // excitations, by their index, that are part of every plan
	Starts int    // random starts of the exchange beside the greedy ones; 0 means 8
	Seed   uint64 // of the random starts
	// Most is how many choices are all tried (exhaustive search); with more of them
	// greedy choice and exchange are what there is. 0 means 1,000,000, below 0 none.
	Most     int
	Workers  int // goroutines; 0 means GOMAXPROCS; no result depends on it
	Progress func(done, total int, what string)
}

// Choice is the best plan found for a number of scans.
type Choice struct {
	Prediction
	Greedy     float64 // cost of taking the best scan more, one after another
	Exchanged  float64 // cost after exchanging scans, the best of all starts
	Exhaustive bool    // all choices were tried: there is no better one
}

// Plans returns the best choice for every number of scans from that of the scans
// that must be in it (1 at least) to most. An error is that of the context.
func (d *Design) Plans(ctx context.Context, most int, s *Settings) ([]Choice, error) {
	if s == nil {
		s = &Settings{}
	}
	var out []Choice
	greedy := slices.Clone(s.Must)
	var before []int
	w := d.worker()
	most = min(most, len(d.use))
	first := max(1, len(s.Must))
	for n := first; n <= most; n++ {
		for len(greedy) < n {
			j, _ := w.bestMore(greedy)
			greedy = append(greedy, j)
		}
		c, err := d.best(ctx, n, greedy, before, s)
		if err != nil {
			return nil, err
		}
		before = c.Lines
		out = append(out, c)
		if s.Progress != nil {
			s.Progress(n-first+1, most-first+1, "planning")
		}
	}
	return out, nil
}

// best searches n scans: exchange from the greedy choice, from the best plan of one
// scan less and its best addition, from greedy choices that begin elsewhere and from
// random ones; and all of them where they are few enough.
func (d *Design) best(ctx context.Context, n int, greedy, before []int, s *Settings) (Choice, error) {
	w := d.worker()
	w.set(greedy)
	out := Choice{Greedy: w.cost()}
	var best []int
	cost := math.Inf(1)
	for _, start := range d.starts(w, n, greedy, before, s) {
		if err := ctx.Err(); err != nil {
			return out, err
		}
		lines, c := w.exchange(start, len(s.Must))
		if better(c, lines, cost, best) {
			best, cost = lines, c
		}
	}
	out.Exchanged = cost
	if d.few(n, s) {
		lines, c, err := d.exhaustive(ctx, n, s)
		if err != nil {
			return out, err
		}
		if c < cost {
			best = lines
		}
		out.Exhaustive = true
	}
	out.Prediction = d.Predict(best)
	return out, nil
}

// better orders choices by cost, equal ones by their lines, so that the order in
// which they were found does not matter.
func better(c float64, lines []int, cost float64, best []int) bool {
	return c < cost || c == cost && (best == nil || slices.Compare(lines, best) < 0)
}

// starts lists choices of n lines, those that must be in them first.
func (d *Design) starts(w *worker, n int, greedy, before []int, s *Settings) [][]int {
	must := len(s.Must)
	out := [][]int{slices.Clone(greedy)}
	if before != nil && n > must {
		rest := mustFirst(before, s.Must)
		j, _ := w.bestMore(rest)
		out = append(out, append(rest, j))
	}
	if n == must {
		return out
	}
	random := s.Starts
	if random == 0 {
		random = 8
	}
	rnd := rand.New(rand.NewPCG(s.Seed, 0x706c616e))
	for i := range random {
		lines := slices.Clone(s.Must)
		if i < random/2 { // a greedy choice from some first line
			lines = append(lines, d.pick(rnd, lines))
			for len(lines) < n {
				j, _ := w.bestMore(lines)
				lines = append(lines, j)
			}
		}
		for len(lines) < n {
			lines = append(lines, d.pick(rnd, lines))
		}
		out = append(out, lines)
	}
	return out
}

// pick draws a line that is not among lines.
func (d *Design) pick(rnd *rand.Rand, lines []int) int {
	for {
		if j := d.use[rnd.IntN(len(d.use))]; !slices.Contains(lines, j) {
			return j
		}
	}
}

// mustFirst orders lines so that those that must be among them come first.
func mustFirst(lines, must []int) []int {
	out := slices.Clone(must)
	for _, j := range lines {
		if !slices.Contains(must, j) {
			out = append(out, j)
		}
	}
	return out
}

// bestMore returns the line whose addition to lines costs least.
func (w *worker) bestMore(lines []int) (line int, cost float64) {
	w.set(lines)
	gram, noise := slices.Clone(w.gram), slices.Clone(w.noise)
	line, cost = -1, math.Inf(1)
	for _, j := range w.d.use {
		if slices.Contains(lines, j) {
			continue
		}
		if c := w.with(lines, gram, noise, j); c < cost {
			line, cost = j, c
		}
	}
	return line, cost
}

// exchange replaces one line after another, always by the best other one, until no
// replacement helps (Fedorov 1972). The first fixed lines stay.
func (w *worker) exchange(start []int, fixed int) ([]int, float64) {
	lines := slices.Clone(start)
	w.set(lines)
	cost := w.cost()
	for range 100 { // falls every time; this many never happened
		improved := false
		for i := fixed; i < len(lines); i++ {
			rest := slices.Delete(slices.Clone(lines), i, i+1)
			if j, c := w.bestMore(rest); j >= 0 && c < cost*(1-1e-12) {
				lines[i], cost, improved = j, c, true
			}
		}
		if !improved {
			break
		}
	}
	return sorted(lines), cost
}

// few says whether all choices of n lines can be tried.
func (d *Design) few(n int, s *Settings) bool {
	most := s.Most
	if most == 0 {
		most = 1_000_000
	}
	free, k := len(d.use)-len(s.Must), n-len(s.Must)
	return combin.LogGeneralizedBinomial(float64(free), float64(k)) <= math.Log(float64(most)+0.5)
}
