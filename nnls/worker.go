package nnls

import (
	"math"
	"math/bits"

	"gonum.org/v1/gonum/floats"
)

// batchWorker is the memory of one goroutine.
type batchWorker struct {
	act     *active
	reduced *reduced  // nil until a sample has a gap
	v       []float64 // a block of one right-hand side
	part    []float64 // of Qᵀ·b, by one block
	z, dual []float64
	c       []float64 // Qᵀ·r of a refinement
	before  []float64 // the answer before it
	row     []float64 // a right-hand side of extreme values, scaled
	gone    []byte    // rows of one right-hand side that are missing
}

func newBatchWorker(f *factor) *batchWorker {
	return &batchWorker{
		act: newActive(f.k, f.n),
		v:   make([]float64, block), part: make([]float64, f.k),
		z: make([]float64, f.k), dual: make([]float64, f.n),
		c: make([]float64, f.k), before: make([]float64, f.n),
		gone: make([]byte, (f.m+63)/64*8),
	}
}

// sample is one right-hand side on its way through a batch.
type sample struct {
	i    int    // its number
	rows int    // used
	gone []byte // rows of the factor that it misses
}

// small calls do for samples that miss the same rows, each with the factor and
// the triangle to solve it on and the right-hand side to that in w.z. The worker
// is another one where the factor is. Where do reports failure on the problem from
// H, it is called again with a factor of the rows present.
func (r *batchRun) small(w *batchWorker, samples []int, do func(*batchWorker, *factor, *triangle, sample) bool) {
	f, gone := r.f, []byte(r.gone[samples[0]-r.from])
	if len(gone) == 0 {
		for _, i := range samples {
			copy(w.z, r.c[(i-r.from)*f.k:])
			do(w, f, &f.tri, sample{i, f.m, nil})
		}
		return
	}
	missing := 0
	for _, b := range gone {
		missing += bits.OnesCount8(b)
	}
	if w.reduced == nil {
		w.reduced = newReduced(f)
	}
	if w.reduced.reduce(f, gone, missing) {
		var failed []int
		for _, i := range samples {
			copy(w.z, r.c[(i-r.from)*f.k:])
			w.reduced.forward(w.z)
			if !do(w, f, &w.reduced.tri, sample{i, f.m - missing, gone}) {
				failed = append(failed, i)
			}
		}
		if samples = failed; len(failed) == 0 {
			return
		}
	}
	f = f.without(gone)
	w = newBatchWorker(f)
	c := make([]float64, f.k)
	for _, i := range samples {
		w.project(f, c, r.scaled(w, i), nil)
		copy(w.z, c)
		do(w, f, &f.tri, sample{i, f.m, nil})
	}
}

// solve solves a sample on the triangle t of the factor f, and reports whether it
// is worth keeping where a better factor can be had.
func (r *batchRun) solve(w *batchWorker, f *factor, t *triangle, s sample) bool {
	bb := r.bb[s.i-r.from]
	normB := math.Sqrt(bb)
	w.act.load(t, w.z, normB)
	w.act.warmAll(t)
	res := &r.results[s.i]
	res.Status = w.act.run(r.maxIter)
	res.Iterations, res.Rank, res.Rows = w.act.iterations, t.k, s.rows
	square := bb - sumSquares(w.z)
	w.residual(t, w.act.x)
	square += sumSquares(w.z)
	res.Violation = violation(w.act.x, w.dual, t.norm, normB)
	digits := eps * t.loss
	if square < leastDifference*t.loss*bb || t.loss > mostLoss || res.Violation > mostViolation {
		square, res.Violation = w.refine(f, t, r.scaled(w, s.i), normB, s.gone)
		digits = eps
	}
	good := res.Violation <= mostViolation
	if normB > 0 { // what the evaluation cannot show
		res.Violation += digits * floats.Dot(t.norm, w.act.x) / normB
	}
	copy(res.Passive, w.act.free)
	if r.errs[s.i] = nil; res.Status == IterationLimit {
		r.errs[s.i] = ErrIterationLimit
	}
	r.finish(w, f, s.i, square)
	return good
}

// finish writes the answer in the caller's units.
func (r *batchRun) finish(w *batchWorker, f *factor, i int, square float64) {
	eb := r.eb[i-r.from]
	r.results[i].Norm = math.Ldexp(math.Sqrt(max(square, 0)), eb+f.ew)
	dst := r.dst.RawRowView(i)
	for j, v := range w.act.x {
		if dst[j] = math.Ldexp(v, eb-f.ea[j]); math.IsInf(dst[j], 0) {
			r.fail(i, "variable %d of the answer exceeds the range of float64; scale a or b", j)
			return
		}
	}
}
