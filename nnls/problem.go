package nnls

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// eps is the unit roundoff of float64, 2⁻⁵³.
const eps = 1.0 / (1 << 53)

// problem is W^½·(a | b) without the rows of weight 0. Every column and b are
// scaled by a power of two to a norm in [½, 1): exact, and proof against
// overflow and underflow of squares. A zero column has exponent 0.
type problem struct {
	m, n int
	a    *mat.Dense // m×n
	b    []float64  // m
	rows []int      // which rows of the caller's matrix are used
	half []float64  // √w·2^−ew of them; nil where all weights are 1
	ea   []int      // a's column j is W^½·a_j·2^−ea[j]
	eb   int        // b is W^½·b·2^−eb
	ew   int        // weights were scaled by 2^−2ew
}

func newProblem(a mat.Matrix, b, weights []float64) (*problem, error) {
	rows, half, ew, err := rootWeights(weights, len(b))
	if err != nil {
		return nil, err
	}
	if len(rows) == 0 {
		return nil, fmt.Errorf("nnls: no rows: a has %d, all of weight 0", len(b))
	}
	_, n := a.Dims()
	p := &problem{
		m: len(rows), n: n, rows: rows, half: half,
		b: make([]float64, len(rows)), ea: make([]int, n), ew: ew,
	}
	for k, i := range rows {
		if p.b[k] = b[i]; !finite(b[i]) {
			return nil, fmt.Errorf("nnls: b[%d] is %v; give the row weight 0 to leave it out", i, b[i])
		}
	}
	p.eb = scale(p.b, half)
	if p.a, err = scaledColumns(p.ea, a, rows, half); err != nil {
		return nil, err
	}
	return p, nil
}

// scaledColumns returns the rows of a times half, every column scaled to a norm
// in [½, 1), and puts the exponents in e.
func scaledColumns(e []int, a mat.Matrix, rows []int, half []float64) (*mat.Dense, error) {
	out := mat.NewDense(len(rows), len(e), nil)
	col := make([]float64, len(rows))
	for j := range e {
		for k, i := range rows {
			if col[k] = a.At(i, j); !finite(col[k]) {
				return nil, fmt.Errorf("nnls: a[%d,%d] is %v; give the row weight 0 to leave it out", i, j, col[k])
			}
		}
		e[j] = scale(col, half)
		out.SetCol(j, col)
	}
	return out, nil
}

// rootWeights returns the rows of weight > 0 and √w·2^−e of them, at most 1; nil
// where all weights are 1.
func rootWeights(w []float64, m int) (rows []int, half []float64, e int, err error) {
	if w == nil {
		rows = make([]int, m)
		for i := range rows {
			rows[i] = i
		}
		return rows, nil, 0, nil
	}
	most := 0.0
	for i, v := range w {
		if !(v >= 0) || math.IsInf(v, 0) {
			return nil, nil, 0, fmt.Errorf("nnls: weight %d is %v, want a finite value ≥ 0", i, v)
		}
		most = max(most, v)
	}
	_, e = math.Frexp(math.Sqrt(most))
	for i, v := range w {
		if v > 0 {
			rows = append(rows, i)
			half = append(half, math.Ldexp(math.Sqrt(v), -e))
		}
	}
	return rows, half, e, nil
}

// scale multiplies v by half (nil: 1) and by the power of two that brings its
// norm to [½, 1), and returns the exponent taken out.
func scale(v, half []float64) int {
	most := 0.0
	for _, x := range v {
		most = max(most, math.Abs(x))
	}
	if most == 0 {
		return 0
	}
	_, e := math.Frexp(most)
	for i := range v {
		v[i] = math.Ldexp(v[i], -e)
	}
	for i, h := range half {
		v[i] *= h
	}
	norm := norm2(v)
	if norm == 0 {
		return 0
	}
	_, f := math.Frexp(norm)
	for i := range v {
		v[i] = math.Ldexp(v[i], -f)
	}
	return e + f
}

// reduce returns the triangle of the pivoted QR factorisation of a, cut at the
// numerical rank, and the part of Qᵀ·b that goes with it.
func (p *problem) reduce() (triangle, []float64) {
	qr, pivot, tau := pivotedQR(p.a)
	t := cutTriangle(qr, pivot)
	c := append([]float64(nil), p.b...)
	applyQT(c, qr, tau)
	return t, c[:t.k]
}

func pivotedQR(a *mat.Dense) (qr blas64.General, pivot []int, tau []float64) {
	qr = mat.DenseCopyOf(a).RawMatrix()
	pivot = make([]int, qr.Cols)
	for j := range pivot {
		pivot[j] = -1
	}
	tau = make([]float64, min(qr.Rows, qr.Cols))
	work := make([]float64, 1)
	lapack64.Geqp3(qr, pivot, tau, work, -1)
	work = make([]float64, int(work[0]))
	lapack64.Geqp3(qr, pivot, tau, work, len(work))
	return qr, pivot, tau
}

// applyQT overwrites c with Qᵀ·c.
func applyQT(c []float64, qr blas64.General, tau []float64) {
	qr.Cols = len(tau)
	g := blas64.General{Rows: len(c), Cols: 1, Stride: 1, Data: c}
	work := make([]float64, 1)
	lapack64.Ormqr(blas.Left, blas.Trans, qr, tau, g, work, -1)
	work = make([]float64, int(work[0]))
	lapack64.Ormqr(blas.Left, blas.Trans, qr, tau, g, work, len(work))
}

// rankOf returns the number of |r_ii| ≥ max(m, n)·2ε·|r_11|, not counting zeros.
func rankOf(qr blas64.General) int {
	rank, least := 0, float64(max(qr.Rows, qr.Cols))*2*eps*math.Abs(qr.Data[0])
	for i := range min(qr.Rows, qr.Cols) {
		if d := math.Abs(qr.Data[i*qr.Stride+i]); d == 0 || d < least {
			break
		}
		rank++
	}
	return rank
}

func (p *problem) unscaleTo(dst, y []float64) {
	for j, v := range y {
		dst[j] = math.Ldexp(v, p.eb-p.ea[j])
	}
}

// certify returns the residual norm, unscaled, and the violation of y.
func (p *problem) certify(y []float64) (norm, v float64) {
	r := make([]float64, p.m)
	for i := range r {
		r[i] = residual(p.b[i], p.a.RawRowView(i), y)
	}
	w := make([]float64, p.n)
	cols := make([]float64, p.n)
	for j := range w {
		w[j], cols[j] = columnDot(p.a, j, r)
	}
	return math.Ldexp(norm2(r), p.eb+p.ew), violation(y, w, cols, norm2(p.b))
}

func columnDot(a *mat.Dense, j int, r []float64) (dot, norm float64) {
	m, _ := a.Dims()
	raw := a.RawMatrix()
	col := make([]float64, m)
	for i := range col {
		col[i] = raw.Data[i*raw.Stride+j]
		dot += col[i] * r[i]
	}
	return dot, norm2(col)
}

func finite(v float64) bool { return v-v == 0 }

func norm2(v []float64) float64 { return blas64.Nrm2(blas64.Vector{N: len(v), Inc: 1, Data: v}) }
