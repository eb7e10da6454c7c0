package nnls

import (
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"gonum.org/v1/gonum/mat"
)

// Batch solves min ‖W^½(a·x_i − b_i)‖, x_i ≥ 0, for one matrix and many
// right-hand sides, called samples. It is safe for concurrent use.
type Batch struct {
	f       *factor
	m       int // rows of the caller's matrix
	maxIter int
	workers int
}

// NewBatch factors the m×n matrix a, with row weights from s, which it does not
// keep. Settings.Warm plays no part: every sample starts with all variables free.
// Errors and panics are those of [SolveTo].
func NewBatch(a mat.Matrix, s *Settings) (*Batch, error) {
	if s == nil {
		s = &Settings{}
	}
	m, n := a.Dims()
	checkSettings(m, n, s)
	p, err := newProblem(a, make([]float64, m), s.Weights)
	if err != nil {
		return nil, err
	}
	workers := s.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	return &Batch{f: newFactor(p), m: m, maxIter: s.limit(n), workers: workers}, nil
}

// Dims returns the shape of the matrix.
func (p *Batch) Dims() (m, n int) { return p.m, p.f.n }

// SolveTo writes the answers into dst (samples × n) for the right-hand sides in b
// (samples × m), and returns one Result a sample. A row is missing from sample i
// where b holds NaN or where missing, which may be nil, has true at i·m + row.
// Samples that miss the same rows share the work for them.
//
// The answer of a sample does not depend, to the last bit, on the samples beside
// it or on the number of workers. A sample that holds an infinite value or has no
// row left gets NaN and the status [Unusable]; the error then says how many and
// names the first, and all others are solved. So it is with [IterationLimit],
// where dst holds the best feasible answer. Wrong shapes panic.
//
// Norm is good to 1e-8 of itself. Violation comes from the small problem on R, or
// where digits are short from the rows, and is good to 1e-12. Beside dst and the
// results, memory is a few blocks of rows a worker, 8·rank + m/8 bytes for each of at
// most 4,096 samples at a time, and where missing rows take what a variable is known
// by, a factorisation of the others a worker.
func (p *Batch) SolveTo(dst, b *mat.Dense, missing []bool) ([]Result, error) {
	samples, m := b.Dims()
	if r, c := dst.Dims(); r != samples || c != p.f.n || m != p.m || (missing != nil && len(missing) != samples*m) {
		panic(fmt.Sprintf("nnls: a is %d×%d, b %d×%d, dst %d×%d, missing has length %d", p.m, p.f.n, samples, m, r, c, len(missing)))
	}
	run := newBatchRun(p, dst, b, missing)
	for range min(p.workers, samples) {
		run.workers = append(run.workers, newBatchWorker(p.f))
	}
	for from := 0; from < samples; from += window {
		run.window(from, min(from+window, samples))
	}
	return run.results, run.failure()
}

// window is the number of samples whose projections are held at a time, and
// among which missing rows are compared.
const window = 4096

// batchRun is one call of Batch.SolveTo.
type batchRun struct {
	*Batch
	dst, b  *mat.Dense
	missing []bool
	results []Result
	errs    []error // nil where all is well

	from    int       // first sample of the window
	c       []float64 // Qᵀ·b, window × stride
	bb      []float64 // ‖b‖²
	eb      []int     // b was scaled by 2^−eb, 0 but for extreme values
	gone    []string  // missing rows, a bit set as the key of a map; "" where none
	workers []*batchWorker
}

func newBatchRun(p *Batch, dst, b *mat.Dense, missing []bool) *batchRun {
	samples, _ := b.Dims()
	held := min(samples, window)
	r := &batchRun{
		Batch: p, dst: dst, b: b, missing: missing,
		results: make([]Result, samples), errs: make([]error, samples),
		c: make([]float64, held*p.f.k), bb: make([]float64, held),
		eb: make([]int, held), gone: make([]string, held),
	}
	passive := make([]bool, samples*p.f.n)
	for i := range r.results {
		r.results[i].Passive = passive[i*p.f.n : (i+1)*p.f.n : (i+1)*p.f.n]
	}
	return r
}

func (r *batchRun) failure() error {
	failed, first := 0, -1
	for i, err := range r.errs {
		if err != nil {
			if failed++; failed == 1 {
				first = i
			}
		}
	}
	if failed == 0 {
		return nil
	}
	return fmt.Errorf("nnls: %d of %d samples failed; sample %d: %w", failed, len(r.errs), first, r.errs[first])
}

// each calls do for every number below tasks, spread over the workers.
func (r *batchRun) each(tasks int, do func(w *batchWorker, task int)) {
	var next atomic.Int64
	var wait sync.WaitGroup
	for _, w := range r.workers[:min(len(r.workers), tasks)] {
		wait.Go(func() {
			for {
				task := int(next.Add(1)) - 1
				if task >= tasks {
					return
				}
				do(w, task)
			}
		})
	}
	wait.Wait()
}

// share is the number of samples a task takes: those with the same missing rows
// find the small problem again this often.
const share = 64

// window solves the samples from ≤ i < to.
func (r *batchRun) window(from, to int) {
	r.from = from
	count := to - from
	r.each((count+share-1)/share, func(w *batchWorker, task int) {
		for i := from + task*share; i < min(from+(task+1)*share, to); i++ {
			r.read(w, i)
		}
	})
	tasks := r.group(from, to)
	r.each(len(tasks), func(w *batchWorker, task int) { r.small(w, tasks[task], r.solve) })
}

// group returns the usable samples in lists that miss the same rows, in the
// order of the first of each, cut to the size of a task.
func (r *batchRun) group(from, to int) [][]int {
	var groups [][]int
	at := make(map[string]int)
	for i := from; i < to; i++ {
		if r.results[i].Status == Unusable {
			continue
		}
		key := r.gone[i-from]
		g, ok := at[key]
		if !ok || len(groups[g]) == share {
			g = len(groups)
			at[key] = g
			groups = append(groups, nil)
		}
		groups[g] = append(groups[g], i)
	}
	return groups
}

// fail marks sample i as unusable.
func (r *batchRun) fail(i int, format string, args ...any) {
	r.errs[i] = fmt.Errorf(format, args...)
	r.results[i] = Result{Status: Unusable, Passive: r.results[i].Passive}
	clear(r.results[i].Passive)
	for j := range r.dst.RawRowView(i) {
		r.dst.RawRowView(i)[j] = math.NaN()
	}
}
