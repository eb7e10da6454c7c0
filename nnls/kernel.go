package nnls

import (
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// block is the number of rows summed at a time: the rounding error of a sum over
// m rows grows with block + m/block instead of m, and a block of Q stays in the
// first-level cache. It is a multiple of 64, the bits of a word, but no power of
// two, so that columns of a block do not compete for the same lines of the cache.
const block = 320

// panels is a matrix that holds blocks of rows, each by columns.
type panels struct {
	rows, cols int
	data       []float64
}

func newPanels(a mat.Matrix) panels {
	m, n := a.Dims()
	p := panels{m, n, make([]float64, m*n)}
	for i := range m {
		at := p.at(i / block * block)
		for j := range n {
			at.q[j*at.ld+i%block] = a.At(i, j)
		}
	}
	return p
}

func (p panels) Dims() (r, c int) { return p.rows, p.cols }

func (p panels) At(i, j int) float64 {
	at := p.at(i / block * block)
	return at.q[j*at.ld+i%block]
}

func (p panels) T() mat.Matrix { return mat.Transpose{Matrix: p} }

// at returns the block that starts at a row.
func (p panels) at(row int) panel {
	rows := min(block, p.rows-row)
	return panel{p.data[row*p.cols : (row+rows)*p.cols], rows}
}

// panel is a block of a matrix: column j is q[j·ld : j·ld + rows].
type panel struct {
	q  []float64
	ld int
}

func (p panel) column(j, rows int) []float64 { return p.q[j*p.ld : j*p.ld+rows] }

// project adds pᵀ·v to c. A dot product a column, by gonum's kernel whatever the
// BLAS: its order of summation depends on the length alone, not on the samples
// beside or where they lie. A whole batch takes less time than the general matrix
// product of its shape alone (BenchmarkMatrixProduct). Plain Go loops with a running
// sum for each of six columns took 1.25 times as long on amd64.
func project(c, v []float64, p panel) {
	for j := range c {
		c[j] += floats.Dot(v, p.column(j, len(v)))
	}
}

// sumSquares returns Σ v²; NaN or +Inf where v holds one.
func sumSquares(v []float64) float64 { return floats.Dot(v, v) }

// norm2 is safe from overflow and underflow.
func norm2(v []float64) float64 { return floats.Norm(v, 2) }
