package nnls

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// Z95 is the one-sided 95 % point of the standard normal distribution.
const Z95 = 1.6448536269514722

// Spread says how far an answer may be off, for data whose rows have variance
// 1/weight. Multiply by s² or s ([Result.Variance]) where the weights are not
// trusted as 1/σ².
type Spread struct {
	// Cov is n×n: (A_Pᵀ·W·A_P)⁻¹ on the positive variables P, 0 elsewhere.
	Cov *mat.SymDense

	// Free holds the least-squares estimate of each variable with P and the
	// variable itself free: x_j for the positive ones, at most 0 (to rounding)
	// for the others.
	Free []float64

	// U is the standard uncertainty of Free. It is +Inf where a variable at
	// zero depends on the positive ones or has a zero column.
	U []float64
}

// Upper returns the upper limit max(0, Free_j + k·s·U_j); k = [Z95] makes it a
// one-sided 95 % limit.
func (s *Spread) Upper(j int, sd, k float64) float64 {
	return max(0, s.Free[j]+k*sd*s.U[j])
}

// Covariance returns the spread of the answer x of [SolveTo] with the same a, b
// and settings.
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
	return act.spread(p), nil
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

// spread returns the spread in the units of p.
func (a *active) spread(p *problem) *Spread {
	out := &Spread{
		Cov:  mat.NewSymDense(a.n, nil),
		Free: make([]float64, a.n),
		U:    make([]float64, a.n),
	}
	inv := a.inverse()
	unit := func(j int) float64 { return math.Ldexp(1, -p.ea[j]-p.ew) }
	for q, j := range a.order {
		out.Free[j] = math.Ldexp(a.s[q], p.eb-p.ea[j])
		for r, l := range a.order[:q+1] {
			v := 0.0
			for i := q; i < len(a.order); i++ {
				v += inv.At(q, i) * inv.At(r, i)
			}
			out.Cov.SetSym(j, l, v*unit(j)*unit(l))
		}
		out.U[j] = math.Sqrt(out.Cov.At(j, j))
	}
	for j := range out.U {
		if a.free[j] {
			continue
		}
		tail := a.tail(j)
		if tail <= a.negligible(j) {
			out.U[j] = math.Inf(1)
			continue
		}
		w := 0.0
		for i := len(a.order); i < a.k; i++ {
			w += a.column(j)[i] * a.c[i]
		}
		out.Free[j] = math.Ldexp(w/(tail*tail), p.eb-p.ea[j])
		out.U[j] = unit(j) / tail
	}
	return out
}

// inverse returns the inverse of the triangle of the free columns.
func (a *active) inverse() *mat.Dense {
	p := len(a.order)
	inv := mat.NewDense(max(p, 1), max(p, 1), nil)
	for c := 0; c < p; c++ {
		for i := c; i >= 0; i-- {
			v := 0.0
			if i == c {
				v = 1
			}
			for l := i + 1; l <= c; l++ {
				v -= a.t[a.order[l]*a.k+i] * inv.At(l, c)
			}
			inv.Set(i, c, v/a.t[a.order[i]*a.k+i])
		}
	}
	return inv
}
