package nnls

import (
	"math"
	"math/bits"
)

// batchWorker is the memory of one goroutine.
type batchWorker struct {
	act     *active
	reduced *reduced
	v       []float64 // a block of one right-hand side
	z, dual []float64
	c       []float64 // Qᵀ·r of a refinement
	before  []float64 // the answer before it
	row     []float64 // a right-hand side of extreme values, scaled
	gone    []byte    // rows of one right-hand side that are missing
}

func newBatchWorker(f *factor) *batchWorker {
	return &batchWorker{
		act: newActive(f.k, f.n), reduced: newReduced(f),
		v: make([]float64, block), z: make([]float64, f.k), dual: make([]float64, f.n), c: make([]float64, f.stride), before: make([]float64, f.n),
		gone: make([]byte, (f.m+63)/64*8),
	}
}

// Squares of norms outside these bounds have lost digits to the range of float64.
const (
	leastSquare = 1e-280
	mostSquare  = 1e280
)

// read projects sample i: c, ‖b‖² and the missing rows.
func (r *batchRun) read(w *batchWorker, i int) {
	at := i - r.from
	c := r.c[at*r.f.stride : (at+1)*r.f.stride]
	b, missing := r.b.RawRowView(i), r.missingRow(i)
	r.eb[at] = 0
	bb, gaps := w.project(r.f, c, b, missing)
	if !(bb >= leastSquare && bb <= mostSquare) {
		e, bad := exponent(r.f, b, missing)
		if bad >= 0 {
			r.fail(i, "b[%d] is %v; make it NaN to leave it out", bad, b[bad])
			return
		}
		if bb != 0 || e != 0 {
			r.eb[at] = e
			bb, gaps = w.project(r.f, c, r.scaled(w, i), nil)
		}
	}
	if gaps == r.f.m {
		r.fail(i, "no row left: all %d are missing or of weight 0", r.m)
		return
	}
	r.bb[at], r.gone[at] = bb, ""
	if gaps > 0 {
		r.gone[at] = string(w.gone)
	}
}

func (r *batchRun) missingRow(i int) []bool {
	if r.missing == nil {
		return nil
	}
	return r.missing[i*r.m : (i+1)*r.m]
}

// scaled returns right-hand side i times 2^−eb, NaN where missing.
func (r *batchRun) scaled(w *batchWorker, i int) []float64 {
	b, e, missing := r.b.RawRowView(i), r.eb[i-r.from], r.missingRow(i)
	if e == 0 {
		return b
	}
	w.row = w.row[:0]
	for k, v := range b {
		if v = math.Ldexp(v, -e); missing != nil && missing[k] {
			v = math.NaN()
		}
		w.row = append(w.row, v)
	}
	return w.row
}

// exponent returns that of the largest value in the rows used, or the first
// infinite one.
func exponent(f *factor, b []float64, missing []bool) (e, bad int) {
	most := 0.0
	for _, k := range f.rows {
		if b[k] != b[k] || (missing != nil && missing[k]) {
			continue
		}
		if math.IsInf(b[k], 0) {
			return 0, k
		}
		most = max(most, math.Abs(b[k]))
	}
	_, e = math.Frexp(most)
	return e, -1
}

// project sets c to Qᵀ·W^½·b, with 0 for missing rows, marks those in w.gone and
// returns their number and ‖W^½·b‖².
func (w *batchWorker) project(f *factor, c, b []float64, missing []bool) (bb float64, gaps int) {
	clear(c)
	clear(w.gone)
	plain := f.half == nil && missing == nil && len(f.rows) == len(b)
	for at := 0; at < f.m; at += block {
		end := min(at+block, f.m)
		if plain && gaps == 0 {
			v := b[at:end]
			if sum := sumSquares(v); sum <= math.MaxFloat64 {
				bb += sum
				project(c, v, f.panel(at))
				continue
			}
		}
		v := w.v[:end-at]
		w.fill(v, f, at, b, missing)
		sum, n := w.mark(v, at)
		bb += sum
		gaps += n
		project(c, v, f.panel(at))
	}
	return bb, gaps
}

// fill writes W^½·b of the rows from at on into v, NaN for missing ones.
func (w *batchWorker) fill(v []float64, f *factor, at int, b []float64, missing []bool) {
	if len(f.rows) == len(b) {
		copy(v, b[at:])
	} else {
		for i, k := range f.rows[at : at+len(v)] {
			v[i] = b[k]
		}
	}
	if missing != nil {
		for i, k := range f.rows[at : at+len(v)] {
			if missing[k] {
				v[i] = math.NaN()
			}
		}
	}
	if f.half != nil {
		for i, h := range f.half[at : at+len(v)] {
			v[i] *= h
		}
	}
}

// mark puts 0 for NaN in v, marks those rows in gone, and returns Σ v² and their
// number.
func (w *batchWorker) mark(v []float64, at int) (sum float64, gaps int) {
	odd := 0.0
	for i, x := range v {
		if x != x {
			v[i] = 0
			gaps++
			setBit(w.gone, at+i)
			continue
		}
		sum, odd = odd+x*x, sum // two running sums
	}
	return sum + odd, gaps
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
			copy(w.z, r.c[(i-r.from)*f.stride:])
			do(w, f, &f.tri, sample{i, f.m, nil})
		}
		return
	}
	missing := 0
	for _, b := range gone {
		missing += bits.OnesCount8(b)
	}
	if w.reduced.reduce(f, gone, missing) {
		var failed []int
		for _, i := range samples {
			copy(w.z, r.c[(i-r.from)*f.stride:])
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
	c := make([]float64, f.stride)
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
	if square < leastDifference*t.loss*bb || t.loss > mostLoss || res.Violation > mostViolation {
		square, res.Violation = w.refine(f, t, r.scaled(w, s.i), normB, s.gone)
	}
	copy(res.Passive, w.act.free)
	if r.errs[s.i] = nil; res.Status == IterationLimit {
		r.errs[s.i] = ErrIterationLimit
	}
	r.finish(w, f, s.i, square)
	return res.Violation <= mostViolation
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

// An answer is refined from the rows of its sample where one of these applies.
const (
	// The residual is less than a thousandth of b: the difference of squares
	// that gives it keeps 9 digits to here.
	leastDifference = 1e-6
	// The missing rows took digits: they left a direction, or all of them
	// together, about this share of their information.
	mostLoss = 1000
	// Large terms cancel.
	mostViolation = 1e-13
)

// residual overwrites z with z − t·y, and dual with tᵀ times that.
func (w *batchWorker) residual(t *triangle, y []float64) {
	t.subtract(w.z, y)
	for j := range w.dual {
		w.dual[j] = dot(t.column(j), w.z)
	}
}

// refine certifies the answer in w.act.x by its residual in the rows themselves
// and improves it as long as that helps. It returns ‖W^½(a·x − b)‖² and the
// violation, and mends what small residuals and large gaps lose in the difference
// of squares and in H.
func (w *batchWorker) refine(f *factor, t *triangle, b []float64, normB float64, gone []byte) (square, v float64) {
	square, v = w.certify(f, t, b, normB, gone)
	for range maxRefine {
		d, gain := w.act.seminormal(w.dual)
		if !worthwhile(v, gain, square) {
			break
		}
		copy(w.before, w.act.x)
		if !w.act.step(d) {
			break
		}
		if gain < 0.01*square {
			// The step moves residual and duals by little: no need of the rows.
			clear(w.z)
			t.subtract(w.z, d)
			for j := range w.dual {
				w.dual[j] += dot(t.column(j), w.z)
			}
			if v2 := violation(w.act.x, w.dual, t.norm, normB); better(v2, square-gain, v, square) {
				return square - gain, v2
			}
			copy(w.act.x, w.before)
			break
		}
		square2, v2 := w.certify(f, t, b, normB, gone)
		if !better(v2, square2, v, square) {
			copy(w.act.x, w.before)
			break
		}
		square, v = square2, v2
	}
	return square, v
}

// certify returns the square of the residual of w.act.x, row by row, and the
// violation, and leaves the duals in w.dual.
func (w *batchWorker) certify(f *factor, t *triangle, b []float64, normB float64, gone []byte) (square, v float64) {
	square = w.projectResidual(f, b, w.act.x, gone)
	for j := range w.dual {
		w.dual[j] = dot(f.tri.column(j), w.c[:f.k])
	}
	return square, violation(w.act.x, w.dual, t.norm, normB)
}

// projectResidual sets w.c to Qᵀ times the residual of y and returns its square.
func (w *batchWorker) projectResidual(f *factor, b, y []float64, gone []byte) float64 {
	clear(w.c)
	square := 0.0
	for at := 0; at < f.m; at += block {
		end := min(at+block, f.m)
		v := w.v[:end-at]
		for i := range v {
			k := at + i
			if v[i] = 0; len(gone) > 0 && bit(gone, k) {
				continue
			}
			x := b[f.rows[k]]
			if f.half != nil {
				x *= f.half[k]
			}
			v[i] = x - dot(f.a[k*f.n:(k+1)*f.n], y)
		}
		square += sumSquares(v)
		project(w.c, v, f.panel(at))
	}
	return square
}
