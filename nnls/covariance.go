package nnls

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// Z95 is the one-sided 95 % point of the standard normal distribution.
const Z95 = 1.6448536269514722

// Spread says how far an answer may be off, for data whose rows have variance
// 1/weight. Multiply variances by s² ([Result.Variance]) where the weights are not
// trusted as 1/σ². While the set P of positive variables stays the same, the answer
// is linear in the data: dx = Cov·aᵀ·W·db over the rows used.
type Spread struct {
	// Cov is n×n: (A_Pᵀ·W·A_P)⁻¹ on the positive variables, 0 elsewhere.
	Cov *mat.SymDense

	// Free holds the least-squares estimate of each variable when it is free
	// beside P: x_j for the positive ones, at most 0 (to rounding) for the others.
	Free []float64

	// U is the standard uncertainty of Free. It is +Inf where a variable at
	// zero depends on the positive ones or has a zero column: the data say
	// nothing about it.
	U []float64
}

// Upper returns the upper limit max(0, Free_j + k·s·U_j), s the standard deviation
// of a row of weight 1; k = [Z95] makes it a one-sided 95 % limit. It is 0 where the
// free estimate lies that far below zero, which noise does in 5 of 100 cases and a
// model that lacks something more often.
func (u *Spread) Upper(j int, s, k float64) float64 {
	return max(0, u.Free[j]+k*s*u.U[j])
}

// Covariance returns the spread of the answer x that [SolveTo] found for the same
// a, b and settings; errors and panics are the same. Only which values of x are
// positive matters.
func Covariance(a mat.Matrix, b, x []float64, s *Settings) (*Spread, error) {
	if s == nil {
		s = &Settings{}
	}
	m, n := a.Dims()
	checkShapes(m, n, len(x), len(b), s)
	p, err := newProblem(a, b, s.Weights)
	if err != nil {
		return nil, err
	}
	t, c := p.reduce()
	act := newActive(t.k, n)
	act.load(&t, c, p.normB)
	act.restore(x)
	return act.spread(p.ea, p.eb, p.ew), nil
}

// Covariance is [Covariance] of the answer x of one sample b, which lacks the rows
// that hold NaN or are marked in missing (nil: none). It works on the small problem
// and costs about as much as solving the sample.
func (p *Batch) Covariance(b, x []float64, missing []bool) (*Spread, error) {
	if len(b) != p.m || len(x) != p.f.n || (missing != nil && len(missing) != p.m) {
		panic(fmt.Sprintf("nnls: a is %d×%d, b has length %d, x %d, missing %d", p.m, p.f.n, len(b), len(x), len(missing)))
	}
	r := newBatchRun(p, mat.NewDense(1, p.f.n, nil), mat.NewDense(1, p.m, b), missing)
	w := newBatchWorker(p.f)
	if r.read(w, 0); r.errs[0] != nil {
		return nil, fmt.Errorf("nnls: %w", r.errs[0])
	}
	var out *Spread
	r.small(w, []int{0}, func(w *batchWorker, f *factor, t *triangle, _ sample) bool {
		w.act.load(t, w.z, math.Sqrt(r.bb[0]))
		w.act.restore(x)
		out = w.act.spread(f.ea, r.eb[0], f.ew)
		return true
	})
	return out, nil
}

// restore frees the positive variables of x.
func (a *active) restore(x []float64) {
	for j, v := range x {
		if v > 0 && a.tail(j) > a.negligible(j) {
			a.add(j)
		}
	}
	a.solve()
}

// spread returns the spread in the caller's units: column j of the matrix was
// scaled by 2^−ea[j], the right-hand side by 2^−eb, the root of the weights by 2^−ew.
func (a *active) spread(ea []int, eb, ew int) *Spread {
	out := &Spread{Cov: mat.NewSymDense(a.n, nil), Free: make([]float64, a.n), U: make([]float64, a.n)}
	unit := func(j int) float64 { return math.Ldexp(1, -ea[j]-ew) }
	inv := a.inverse()
	for q, j := range a.order {
		out.Free[j] = math.Ldexp(a.s[q], eb-ea[j])
		for r, l := range a.order[:q+1] {
			v := 0.0
			for i := q; i < len(inv); i++ {
				v += inv[i][q] * inv[i][r]
			}
			out.Cov.SetSym(j, l, v*unit(j)*unit(l))
		}
		out.U[j] = math.Sqrt(out.Cov.At(j, j))
	}
	for j, free := range a.free {
		if free {
			continue
		}
		tail := a.tail(j)
		if tail <= a.negligible(j) {
			out.U[j] = math.Inf(1)
			continue
		}
		p := len(a.order)
		w := floats.Dot(a.column(j)[p:], a.c[p:])
		out.Free[j] = math.Ldexp(w/(tail*tail), eb-ea[j])
		out.U[j] = unit(j) / tail
	}
	return out
}

// inverse returns the inverse of the triangle of the free columns, by columns.
func (a *active) inverse() [][]float64 {
	inv := make([][]float64, len(a.order))
	for c := range inv {
		col := make([]float64, len(inv))
		col[c] = 1
		for q := c; q >= 0; q-- {
			t := a.column(a.order[q])
			col[q] /= t[q]
			for l, x := range t[:q] {
				col[l] -= x * col[q]
			}
		}
		inv[c] = col
	}
	return inv
}
