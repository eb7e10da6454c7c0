package nnls

import "gonum.org/v1/gonum/blas/blas64"

// triangle is a small problem min ‖t·x − c‖ in the form that an active set
// starts from: the columns in order form an upper triangle.
type triangle struct {
	k, n  int
	t     []float64 // k×n by columns
	norm  []float64 // n, of the columns
	order []int     // k of the columns
	err   float64   // rounding error of a column, relative to its norm
	loss  float64   // times that t and c lost in digits on the way, ≥ 1
}

func newTriangle(k, n int, order []int) triangle {
	return triangle{k: k, n: n, t: make([]float64, k*n), norm: make([]float64, n), order: order, loss: 1}
}

func (t *triangle) column(j int) []float64 { return t.t[j*t.k : (j+1)*t.k] }

func (t *triangle) measure() {
	for j := range t.norm {
		t.norm[j] = norm2(t.column(j))
	}
}

// cutTriangle returns the first rows of R, as many as the rank.
func cutTriangle(qr blas64.General, pivot []int) triangle {
	k, err := rankOf(qr)
	t := newTriangle(k, qr.Cols, pivot[:k])
	t.err = err
	for q, j := range pivot {
		col := t.column(j)
		for i := range min(q+1, k) {
			col[i] = qr.Data[i*qr.Stride+q]
		}
	}
	t.measure()
	return t
}

// subtract subtracts t·y from z.
func (t *triangle) subtract(z, y []float64) {
	for j, v := range y {
		if v == 0 {
			continue
		}
		for i, x := range t.column(j) {
			z[i] -= x * v
		}
	}
}
