package parafac

import (
	"math"
	"sync"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/gonum"
)

// The products of a fit are skinny, F columns against thousands of rows. They go
// through gonum's matrix–vector kernel on panels that stay in the cache, which
// runs at about twice the speed of scalar loops, and three to six times that of a
// general matrix product; it is called as such because the calls are too small
// for a library behind blas64 to use its threads on.
var kernel gonum.Implementation

// longVector is the length from which a call of the library pays.
const longVector = 48

func dot(x, y []float64) float64 {
	if len(x) >= longVector {
		return kernel.Ddot(len(x), x, 1, y, 1)
	}
	var s0, s1, s2, s3 float64
	y = y[:len(x)]
	i := 0
	for ; i+4 <= len(x); i += 4 {
		s0 += x[i] * y[i]
		s1 += x[i+1] * y[i+1]
		s2 += x[i+2] * y[i+2]
		s3 += x[i+3] * y[i+3]
	}
	for ; i < len(x); i++ {
		s0 += x[i] * y[i]
	}
	return (s0 + s1) + (s2 + s3)
}

func sumSquares(x []float64) float64 { return dot(x, x) }

// norm is the 2-norm, without care for overflow: the data are scaled.
func norm(x []float64) float64 { return math.Sqrt(dot(x, x)) }

func axpy(a float64, x, y []float64) {
	if len(x) >= longVector {
		kernel.Daxpy(len(x), a, x, 1, y, 1)
		return
	}
	y = y[:len(x)]
	for i, v := range x {
		y[i] += a * v
	}
}

// A panel is panelRows rows by panelCells cells of the larger operand.
const (
	panelRows  = 16
	panelCells = 256
)

type panel [panelRows * panelCells]float64

var panels = sync.Pool{New: func() any { return new(panel) }}

// eachPanel calls do with every panel of x: rows that are stride apart in p, its
// first row and cell and its extent. Rows that are not neighbours in memory are
// copied, which costs a tenth of a product.
func eachPanel(x [][]float64, do func(p []float64, stride, row, rows, cell, cells int)) {
	if len(x) == 0 {
		return
	}
	copied := panels.Get().(*panel)
	defer panels.Put(copied)
	n := len(x[0])
	for row := 0; row < len(x); row += panelRows {
		now := x[row:min(row+panelRows, len(x))]
		all := joinedRows(now)
		for cell := 0; cell < n; cell += panelCells {
			cells := min(panelCells, n-cell)
			if all != nil {
				do(all[cell:], n, row, len(now), cell, cells)
				continue
			}
			for r, v := range now {
				copy(copied[r*panelCells:], v[cell:cell+cells])
			}
			do(copied[:], panelCells, row, len(now), cell, cells)
		}
	}
}

// joinedRows returns rows that follow one another in memory as one, else nil.
func joinedRows(rows [][]float64) []float64 {
	n := len(rows[0])
	if cap(rows[0]) < len(rows)*n {
		return nil
	}
	all := rows[0][:len(rows)*n]
	for r, v := range rows {
		if len(v) != n || &v[0] != &all[r*n] {
			return nil
		}
	}
	return all
}

// rowsTimesTo writes dst = X·KT', rows × f, for the rows of X and KT f × n.
func rowsTimesTo(dst []float64, x [][]float64, kt []float64, f int) {
	clear(dst[:len(x)*f])
	eachPanel(x, func(p []float64, stride, row, rows, cell, cells int) {
		n := len(x[0])
		for g := range f {
			kernel.Dgemv(blas.NoTrans, rows, cells, 1, p, stride, kt[g*n+cell:], 1, 1, dst[row*f+g:], f)
		}
	})
}

// addTransposed adds A'·X to dst, f × n, for A rows × f and the rows of X.
func addTransposed(dst, a []float64, x [][]float64, f int) {
	eachPanel(x, func(p []float64, stride, row, rows, cell, cells int) {
		n := len(x[0])
		for g := range f {
			kernel.Dgemv(blas.Trans, rows, cells, 1, p, stride, a[row*f+g:], f, 1, dst[g*n+cell:], 1)
		}
	})
}

// gramTo writes the f × f Gram matrix of the columns of a, rows × f.
func gramTo(dst, a []float64, rows, f int) {
	clear(dst[:f*f])
	for r := range rows {
		v := a[r*f : (r+1)*f]
		for g, x := range v {
			if x == 0 {
				continue
			}
			for h := g; h < f; h++ {
				dst[g*f+h] += x * v[h]
			}
		}
	}
	mirror(dst, f)
}

func mirror(s []float64, f int) {
	for g := range f {
		for h := g + 1; h < f; h++ {
			s[h*f+g] = s[g*f+h]
		}
	}
}

// cholesky factors the symmetric n × n matrix h = L·L' in place (lower
// triangle). It says false at a pivot that is not above tiny times the diagonal.
func cholesky(h []float64, n int, tiny float64) bool {
	for c := range n {
		d := h[c*n+c]
		d0 := d
		for q := range c {
			d -= h[c*n+q] * h[c*n+q]
		}
		if !(d > tiny*d0) {
			return false
		}
		d = math.Sqrt(d)
		h[c*n+c] = d
		for r := c + 1; r < n; r++ {
			v := h[r*n+c]
			for q := range c {
				v -= h[r*n+q] * h[c*n+q]
			}
			h[r*n+c] = v / d
		}
	}
	return true
}

// solveCholesky solves L·L'·x = x in place.
func solveCholesky(l, x []float64, n int) {
	forward(l, x, n)
	for r := n - 1; r >= 0; r-- {
		for q := r + 1; q < n; q++ {
			x[r] -= l[q*n+r] * x[q]
		}
		x[r] /= l[r*n+r]
	}
}

// forward solves L·x = x in place.
func forward(l, x []float64, n int) {
	for r := range n {
		for q := range r {
			x[r] -= l[r*n+q] * x[q]
		}
		x[r] /= l[r*n+r]
	}
}
