package nnls

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Violation returns by how much x fails the conditions of optimality of
// min ‖a·x − b‖, x ≥ 0 (Karush–Kuhn–Tucker), in a scale-free measure. With the
// dual w = aᵀ(b − a·x) it is the largest of
//
//	 w_j  / (‖a_j‖‖b‖)   where x_j = 0 (could still grow),
//	|w_j| / (‖a_j‖‖b‖)   where x_j > 0 (not at the bottom),
//	−x_j · ‖a_j‖/‖b‖     where x_j < 0 (not feasible),
//
// and never below 0. An answer passes where this is at most 1e-10. The rounding of
// x alone gives about 1e-16·Σ‖a_j‖|x_j|/‖b‖, so that no answer passes whose terms
// exceed b by more than 10⁶ and cancel. The matrix a
// is m×n, b has m values, x has n; wrong lengths panic. A value that is not
// finite gives +Inf. With weights, hand over W^½·a and W^½·b.
func Violation(a mat.Matrix, b, x []float64) float64 {
	m, n := a.Dims()
	if len(b) != m || len(x) != n {
		panic(fmt.Sprintf("nnls: a is %d×%d, b has length %d and x %d", m, n, len(b), len(x)))
	}
	p, err := newProblem(a, b, nil)
	if err != nil {
		return math.Inf(1)
	}
	y := make([]float64, n)
	for j, v := range x {
		if !finite(v) {
			return math.Inf(1)
		}
		y[j] = math.Ldexp(v, p.ea[j]-p.eb)
	}
	_, _, v := p.certify(y)
	return v
}

// violation is [Violation] of the dual w, with the norms of columns and b.
func violation(x, w, cols []float64, b float64) float64 {
	worst := 0.0
	for j, v := range x {
		scale := cols[j] * b
		bad := w[j]
		if v != 0 {
			bad = math.Abs(w[j])
		}
		if bad > 0 {
			worst = max(worst, bad/scale)
		}
		if v < 0 && cols[j] > 0 {
			worst = max(worst, -v*cols[j]/b)
		}
	}
	if math.IsNaN(worst) {
		return math.Inf(1)
	}
	return worst
}

// residual returns b − row·x, summed in twice the precision: with nearly
// collinear columns the terms cancel.
func residual(b float64, row, x []float64) float64 {
	hi, lo := b, 0.0
	for j, v := range row {
		p := -v * x[j]
		lo += math.FMA(-v, x[j], -p)
		s := hi + p
		t := s - hi
		lo += (hi - (s - t)) + (p - t)
		hi = s
	}
	return hi + lo
}
