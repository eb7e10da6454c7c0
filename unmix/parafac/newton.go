package parafac

import (
	"context"
	"math"
	"slices"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// newton is the last part of a fit: Gauss–Newton steps in the loadings with the
// scores projected out, on the samples themselves and with their true gaps. Its
// matrix, (J+K)·F square, is
//
//	H = Σ_i D_i'D_i − D_i'K_i (K_i'K_i)⁻¹ K_i'D_i
//
// where D_i holds the derivatives of sample i's cells by the loadings and K_i
// its model rows with the scores that are above zero. Common cells enter through
// F × F Gram matrices, so that no data are touched (NUMERICS 2e).
type newton struct {
	*als
	nb      int       // entries of b, before those of c
	theta   []int     // entries that can move: index into b, or nb + index into c
	at      []int     // place of each entry in theta, −1 if it cannot move
	grad    []float64 // of ½ loss by every entry
	hb      []float64 // J × F × F: diagonal blocks, ridge included
	hc      []float64 // K × F × F
	h       []float64 // n × n, upper
	work    []float64 // n × n: what chol holds
	chol    blas64.Symmetric
	plain   bool      // chol is the factor of H, all of it and without damping
	built   []int     // theta of H
	mb      []float64 // (J·F) × F and (K·F) × F: D'K without the score in front
	mc      []float64
	inv     []float64 // F × F scratch
	scratch []float64 // (J+K)·F + P: a sample's gradient and residual
	delta   float64   // certificate at the last gradient
}

func (s *als) newton() *newton {
	nb := s.j * s.f
	return &newton{als: s, nb: nb, at: make([]int, nb+s.k*s.f), grad: make([]float64, nb+s.k*s.f), scratch: make([]float64, nb+s.k*s.f+s.p)}
}

// sigma2 is the residual variance of the scaled data.
func (n *newton) sigma2() float64 {
	cells := 0
	for i := range n.i {
		cells += n.p - len(n.gaps[i])
	}
	dof := float64(cells - len(n.theta) - n.i*n.f)
	return math.Max(n.loss, roundOff*n.x2) / math.Max(dof, 1)
}

// gradient solves for the scores and sets grad and the list of entries that can
// move: not fixed, and not held at zero by the sign constraint.
func (n *newton) gradient() {
	n.exactScores()
	n.project()
	hb, qb := n.normal(n.modeB())
	n.ridgeB()
	n.half(n.b, hb, qb, n.dampB, 0)
	hc, qc := n.normal(n.modeC())
	n.ridgeC()
	n.half(n.c, hc, qc, n.dampC, n.nb)
	n.theta = n.theta[:0]
	for e, g := range n.grad {
		x, fixed := n.entry(e)
		n.at[e] = -1
		if !fixed && (n.free || *x > 0 || g < 0) {
			n.at[e] = len(n.theta)
			n.theta = append(n.theta, e)
		}
	}
}

// half writes the gradient by one mode and adds the ridge to its matrices.
func (n *newton) half(x, hs, qs []float64, damped []bool, from int) {
	f := n.f
	lam := make([]float64, f)
	for at := 0; at < len(x); at += f {
		n.rowRidge(lam, damped, at)
		for u := range f {
			hs[at*f+u*f+u] += lam[u]
			n.grad[from+at+u] = dot(hs[at*f+u*f:at*f+u*f+f], x[at:at+f]) - qs[at+u]
		}
	}
	if from == 0 {
		n.hb = append(n.hb[:0], hs...)
	} else {
		n.hc = append(n.hc[:0], hs...)
	}
}

func (n *newton) entry(e int) (*float64, bool) {
	if e < n.nb {
		return &n.b[e], n.fixB != nil && n.fixB[e]
	}
	return &n.c[e-n.nb], n.fixC != nil && n.fixC[e-n.nb]
}

// factor factors H + damp·diag(H) over the entries of theta where keep is true
// (nil: all), leaving the others out. It says false where that is singular.
func (n *newton) factor(damp float64, keep []bool) bool {
	m := len(n.theta)
	if len(n.work) < m*m {
		n.work = make([]float64, m*m)
	}
	for try, shift := 0, damp; try < 4; try++ {
		h := n.work[:m*m]
		copy(h, n.h)
		for i := range m {
			h[i*m+i] *= 1 + shift
			if keep != nil && !keep[i] {
				clear(h[i*m+i+1 : (i+1)*m])
				for r := range i {
					h[r*m+i] = 0
				}
				h[i*m+i] = 1
			}
		}
		n.chol = blas64.Symmetric{N: m, Stride: m, Data: h, Uplo: blas.Upper}
		n.plain = shift == 0 && keep == nil
		if _, ok := lapack64.Potrf(n.chol); ok {
			return true
		}
		shift = math.Max(1e-12, shift*1e3)
	}
	return false
}

func (n *newton) triangle() blas64.Triangular {
	return blas64.Triangular{N: n.chol.N, Stride: n.chol.Stride, Data: n.chol.Data, Uplo: blas.Upper, Diag: blas.NonUnit}
}

// decrement factors H and sets delta. It says false where H is singular.
func (n *newton) decrement() bool {
	n.delta = math.Inf(1)
	if len(n.theta) == 0 || !n.plain && !n.factor(0, nil) {
		return false
	}
	step := n.solve(nil, nil)
	var d float64
	for i, e := range n.theta {
		d -= step[i] * n.grad[e]
	}
	n.delta = math.Sqrt(math.Max(d, 0) / n.sigma2())
	return true
}

// solve returns −H⁻¹g, where entries of theta not in keep move by to.
func (n *newton) solve(keep []bool, to []float64) []float64 {
	m := len(n.theta)
	step := make([]float64, m)
	for i, e := range n.theta {
		step[i] = -n.grad[e]
	}
	for i := range m {
		if keep == nil || keep[i] || to[i] == 0 {
			continue
		}
		for r := range m { // the others' share of a move that is decided
			step[r] -= n.h[min(r, i)*m+max(r, i)] * to[i]
		}
	}
	for i := range m {
		if keep != nil && !keep[i] {
			step[i] = to[i]
		}
	}
	lapack64.Potrs(n.triangle(), blas64.General{Rows: m, Cols: 1, Stride: 1, Data: step})
	return step
}

// bounded returns the step that minimises the quadratic model with no entry
// below zero: entries that would go there are set there and the others solved
// again, a few times.
func (n *newton) bounded(damp float64) []float64 {
	if !(damp == 0 && n.plain) && !n.factor(damp, nil) {
		return nil
	}
	step := n.solve(nil, nil)
	if n.free {
		return step
	}
	m := len(n.theta)
	keep, to := make([]bool, m), make([]float64, m)
	for i := range keep {
		keep[i] = true
	}
	for range recuts {
		cut := false
		for i, e := range n.theta {
			if x, _ := n.entry(e); keep[i] && *x+step[i] < 0 {
				keep[i], to[i], cut = false, -*x, true
			}
		}
		if !cut {
			break
		}
		if !n.factor(damp, keep) {
			return nil
		}
		step = n.solve(keep, to)
	}
	return step
}

const (
	newtonSteps = 40   // at most, 0 for a model that two components share
	recuts      = 3    // times a step is solved again with what went below zero set there
	certified   = 0.1  // δ of a converged fit
	goodEnough  = 1e-3 // δ at which the steps end
	goodForNow  = 0.03 // the same while a number of components is being chosen
)

// finish takes Gauss–Newton steps, damped as Levenberg and Marquardt do, until
// the certificate is enough or no step lowers the loss any more. H is built anew
// only when other entries move or the last step did little: near the end it stays
// what it was, and a step costs two readings of the samples.
func (n *newton) finish(ctx context.Context, steps int, enough float64) error {
	n.gradient()
	n.build()
	if !n.decrement() {
		return nil
	}
	damp, stale := 0.0, 0
	for range steps {
		if err := ctx.Err(); err != nil {
			return err
		}
		if n.delta <= enough {
			break
		}
		before := n.delta
		if damp = n.step(damp); math.IsInf(damp, 1) {
			break
		}
		n.iter++
		if !n.plain || !slices.Equal(n.theta, n.built) {
			n.build()
		}
		if !n.decrement() {
			return nil
		}
		if n.delta > 0.9*before {
			n.plain = false
			if stale++; stale > 3 {
				break
			}
		}
	}
	if !n.plain || !slices.Equal(n.theta, n.built) {
		n.build()
		n.decrement()
	}
	return nil
}

// step goes one step, with more damping until the loss falls, and returns the
// damping for the next one, infinite when none helped.
func (n *newton) step(damp float64) float64 {
	b, c, a, loss := append([]float64(nil), n.b...), append([]float64(nil), n.c...), append([]float64(nil), n.a...), n.loss
	theta, grad := append([]int(nil), n.theta...), append([]float64(nil), n.grad...)
	for range 4 {
		if move := n.bounded(damp); move != nil {
			for i, e := range n.theta {
				x, _ := n.entry(e)
				*x += move[i]
				if *x < 0 && !n.free {
					*x = 0
				}
			}
			n.unit()
			n.gradient()
			if n.loss <= loss+roundOff*n.x2 {
				if damp < 1e-6 {
					return 0
				}
				return damp / 10
			}
		}
		damp = math.Max(1e-4, damp*10)
		copy(n.b, b)
		copy(n.c, c)
		n.theta = append(n.theta[:0], theta...)
		copy(n.grad, grad)
	}
	copy(n.a, a)
	n.gradient()
	return math.Inf(1)
}
