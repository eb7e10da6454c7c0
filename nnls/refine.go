package nnls

import "gonum.org/v1/gonum/floats"

// An answer is refined from the rows of its sample where one of these applies.
const (
	// The residual is less than a three-thousandth of b: the difference of
	// squares that gives it keeps 8 digits to here.
	leastDifference = 1e-7
	// The missing rows took digits: they left a direction, or all of them
	// together, about this share of their information.
	mostLoss = 1000
	// Large terms cancel.
	mostViolation = 1e-13
)

// maxRefine limits the corrections of one answer.
const maxRefine = 3

// worthwhile reports whether a correction that lowers the square of the residual
// norm by gain can change what a reader sees.
func worthwhile(v, gain, square float64) bool { return v > 4*eps || gain > 1e-12*square }

// better reports whether a corrected answer of violation v and residual norm r is
// to be kept in place of that of v0 and r0.
func better(v, r, v0, r0 float64) bool { return v < v0 || (r < r0 && v < mostViolation) }

// seminormal solves TᵀT·d = g on the free variables, T their triangle, and
// returns d, 0 elsewhere, and ‖T·d‖². With g = Aᵀ·r of the residual r it is the
// corrected seminormal equation (Björck, Linear Algebra Appl. 1987, 88/89, 31, cited from memory),
// which serves as QR does while the condition number of T is below 1/√ε.
func (a *active) seminormal(g []float64) (d []float64, gain float64) {
	u := a.s
	for q, j := range a.order {
		col := a.column(j)
		u[q] = (g[j] - floats.Dot(col[:q], u[:q])) / col[q]
		gain += u[q] * u[q]
	}
	clear(a.d)
	for q := len(a.order) - 1; q >= 0; q-- {
		j := a.order[q]
		v := u[q] / a.column(j)[q]
		a.d[j] = v
		for l, x := range a.column(j)[:q] {
			u[l] -= x * v
		}
	}
	return a.d, gain
}

// step adds d to x, and reports whether it could: free variables stay positive.
func (a *active) step(d []float64) bool {
	for _, j := range a.order {
		if !(a.x[j]+d[j] > 0) {
			return false
		}
	}
	for _, j := range a.order {
		a.x[j] += d[j]
	}
	return true
}

// refine certifies the answer of act and improves it from its residual as long as
// that helps. It returns the residual norm, in the units of p, and the violation.
func (p *problem) refine(act *active) (norm, v float64) {
	norm, w, v := p.certify(act.x)
	before := make([]float64, p.n)
	for range maxRefine {
		d, gain := act.seminormal(w)
		if !worthwhile(v, gain, norm*norm) {
			break
		}
		copy(before, act.x)
		if !act.step(d) {
			break
		}
		norm2, w2, v2 := p.certify(act.x)
		if !better(v2, norm2, v, norm) {
			copy(act.x, before)
			break
		}
		norm, w, v = norm2, w2, v2
	}
	return norm, v
}

// residual overwrites z with z − t·y, and dual with tᵀ times that.
func (w *batchWorker) residual(t *triangle, y []float64) {
	t.subtract(w.z, y)
	for j := range w.dual {
		w.dual[j] = floats.Dot(t.column(j), w.z)
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
				w.dual[j] += floats.Dot(t.column(j), w.z)
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
		w.dual[j] = floats.Dot(f.tri.column(j), w.c[:f.k])
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
		w.fill(v, f, at, b, nil)
		a := f.a.at(at)
		for j, x := range y {
			if x != 0 {
				floats.AddScaled(v, -x, a.column(j, len(v)))
			}
		}
		if len(gone) > 0 {
			for i := range v {
				if bit(gone, at+i) {
					v[i] = 0
				}
			}
		}
		square += sumSquares(v)
		project(w.c, v, f.q.at(at))
	}
	return square
}
