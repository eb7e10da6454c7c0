package nnls

import "math"

// Squares of norms outside these bounds have lost digits to the range of float64.
const (
	leastSquare = 1e-280
	mostSquare  = 1e280
)

// read projects sample i: c, ‖b‖² and the missing rows.
func (r *batchRun) read(w *batchWorker, i int) {
	at := i - r.from
	c := r.c[at*r.f.k : (at+1)*r.f.k]
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
			// The product first: it is slow enough to hide the memory that the
			// sum of squares would wait for. That shows whether it counts.
			v := b[at:end]
			clear(w.part)
			project(w.part, v, f.q.at(at))
			if sum := sumSquares(v); sum <= math.MaxFloat64 {
				bb += sum
				for j, x := range w.part {
					c[j] += x
				}
				continue
			}
		}
		v := w.v[:end-at]
		w.fill(v, f, at, b, missing)
		sum, n := w.mark(v, at)
		bb += sum
		gaps += n
		project(c, v, f.q.at(at))
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
