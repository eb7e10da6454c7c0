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
	m, n  int
	a     *mat.Dense // m×n
	b     []float64  // m
	norm  []float64  // n, of the columns of a
	normB float64    // of b
	rows  []int      // which rows of the caller's matrix are used
	half  []float64  // √w·2^−ew of them; nil where all weights are 1
	ea    []int      // a's column j is W^½·a_j·2^−ea[j]
	eb    int        // b is W^½·b·2^−eb
	ew    int        // weights were scaled by 2^−2ew
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
	p := &problem{m: len(rows), n: n, rows: rows, half: half, ew: ew}
	for _, i := range rows {
		if !finite(b[i]) {
			return nil, fmt.Errorf("nnls: b[%d] is %v; give the row weight 0 to leave it out", i, b[i])
		}
	}
	bs, normB, eb, _ := scaledColumns(mat.NewVecDense(len(b), b), rows, half)
	p.b, p.normB, p.eb = bs.RawMatrix().Data, normB[0], eb[0]
	p.a, p.norm, p.ea, err = scaledColumns(a, rows, half)
	return p, err
}

// scaledColumns returns the given rows of a times half (nil: 1), every column
// scaled to a norm in [½, 1), those norms, and the exponents taken out.
func scaledColumns(a mat.Matrix, rows []int, half []float64) (out *mat.Dense, norm []float64, e []int, err error) {
	_, n := a.Dims()
	out = mat.NewDense(len(rows), n, nil)
	v, most := out.RawMatrix().Data, make([]float64, n)
	for k, i := range rows {
		for j := range most {
			x := a.At(i, j)
			if !finite(x) {
				return nil, nil, nil, fmt.Errorf("nnls: a[%d,%d] is %v; give the row weight 0 to leave it out", i, j, x)
			}
			v[k*n+j] = x
			most[j] = max(most[j], math.Abs(x))
		}
	}
	e = exponents(most)
	norm = timesPowers(v, half, e)
	for j, f := range exponents(norm) {
		e[j] += f
		norm[j] = math.Ldexp(norm[j], -f)
		most[j] = math.Ldexp(1, -f)
	}
	for at := 0; at < len(v); at += n {
		for j, f := range most {
			v[at+j] *= f
		}
	}
	return out, norm, e, nil
}

// timesPowers multiplies row k of v by half[k] and column j by 2^−e[j], and
// returns the norms of the columns.
func timesPowers(v, half []float64, e []int) (norm []float64) {
	n := len(e)
	norm = make([]float64, n)
	first, second := make([]float64, n), make([]float64, n)
	for j, p := range e { // in two steps, as 2^−e may exceed the range
		first[j], second[j] = math.Ldexp(1, -p/2), math.Ldexp(1, -p+p/2)
	}
	for k := 0; k*n < len(v); k++ {
		h := 1.0
		if half != nil {
			h = half[k]
		}
		row := v[k*n : (k+1)*n]
		for j, x := range row {
			x = x * first[j] * second[j] * h
			row[j] = x
			norm[j] += x * x
		}
	}
	for j, s := range norm {
		norm[j] = math.Sqrt(s)
	}
	return norm
}

// exponents returns e with v in [½, 1)·2^e, 0 for 0.
func exponents(v []float64) []int {
	e := make([]int, len(v))
	for j, x := range v {
		_, e[j] = math.Frexp(x)
	}
	return e
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

// rankOf returns the number of |r_ii| ≥ err·|r_11|, not counting zeros, with
// err = max(m, n)·2ε.
func rankOf(qr blas64.General) (rank int, err float64) {
	err = float64(max(qr.Rows, qr.Cols)) * 2 * eps
	for i := range min(qr.Rows, qr.Cols) {
		if d := math.Abs(qr.Data[i*qr.Stride+i]); d == 0 || d < err*math.Abs(qr.Data[0]) {
			break
		}
		rank++
	}
	return rank, err
}

func (p *problem) unscaleTo(dst, y []float64) {
	for j, v := range y {
		dst[j] = math.Ldexp(v, p.eb-p.ea[j])
	}
}

// certify returns the residual norm of y and the duals, both in the units of p,
// and the violation.
func (p *problem) certify(y []float64) (norm float64, w []float64, v float64) {
	w = make([]float64, p.n)
	square := 0.0
	for i, b := range p.b {
		row := p.a.RawRowView(i)
		r := residual(b, row, y)
		square += r * r
		for j, x := range row {
			w[j] += x * r
		}
	}
	return math.Sqrt(square), w, violation(y, w, p.norm, p.normB)
}

func finite(v float64) bool { return v-v == 0 }
