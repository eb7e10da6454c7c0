package nnls

import "gonum.org/v1/gonum/mat"

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

// newPanels copies a and adds zero columns up to cols.
func newPanels(a mat.Matrix, cols int) panels {
	m, n := a.Dims()
	p := panels{m, cols, make([]float64, m*cols)}
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

func (p panel) from(j int) panel { return panel{p.q[j*p.ld:], p.ld} }

func (p panel) column(j, rows int) []float64 { return p.q[j*p.ld : j*p.ld+rows] }

// padded returns k rounded up to the even number of columns that the kernels
// work on.
func padded(k int) int { return (k + 1) &^ 1 }

// project adds pᵀ·v to c, an even number of columns. Each sum runs over the rows
// in order, whatever the machine or the samples beside it. With as many running
// sums as the registers hold, a whole batch takes less time than the general
// matrix product of its shape alone (BenchmarkMatrixProduct).
func project(c, v []float64, p panel) {
	for len(c) > 0 && len(v) > 0 {
		width := 8
		switch {
		case len(c) >= 8:
			project8(c, v, p)
		case len(c) >= 6:
			width = 6
			project6(c, v, p)
		case len(c) >= 4:
			width = 4
			project4(c, v, p)
		default:
			width = 2
			project2(c, v, p)
		}
		if c = c[width:]; len(c) > 0 {
			p = p.from(width)
		}
	}
}

func project8(c, v []float64, p panel) {
	var c0, c1, c2, c3, c4, c5, c6, c7 float64
	n := len(v)
	q0, q1, q2, q3 := p.column(0, n), p.column(1, n), p.column(2, n), p.column(3, n)
	q4, q5, q6, q7 := p.column(4, n), p.column(5, n), p.column(6, n), p.column(7, n)
	for i, x := range v {
		c0 += x * q0[i]
		c1 += x * q1[i]
		c2 += x * q2[i]
		c3 += x * q3[i]
		c4 += x * q4[i]
		c5 += x * q5[i]
		c6 += x * q6[i]
		c7 += x * q7[i]
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
	c[4] += c4
	c[5] += c5
	c[6] += c6
	c[7] += c7
}

func project6(c, v []float64, p panel) {
	var c0, c1, c2, c3, c4, c5 float64
	n := len(v)
	q0, q1, q2 := p.column(0, n), p.column(1, n), p.column(2, n)
	q3, q4, q5 := p.column(3, n), p.column(4, n), p.column(5, n)
	for i, x := range v {
		c0 += x * q0[i]
		c1 += x * q1[i]
		c2 += x * q2[i]
		c3 += x * q3[i]
		c4 += x * q4[i]
		c5 += x * q5[i]
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
	c[4] += c4
	c[5] += c5
}

func project4(c, v []float64, p panel) {
	var c0, c1, c2, c3 float64
	n := len(v)
	q0, q1, q2, q3 := p.column(0, n), p.column(1, n), p.column(2, n), p.column(3, n)
	for i, x := range v {
		c0 += x * q0[i]
		c1 += x * q1[i]
		c2 += x * q2[i]
		c3 += x * q3[i]
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
}

func project2(c, v []float64, p panel) {
	var c0, c1 float64
	n := len(v)
	q0, q1 := p.column(0, n), p.column(1, n)
	for i, x := range v {
		c0 += x * q0[i]
		c1 += x * q1[i]
	}
	c[0] += c0
	c[1] += c1
}

// sumSquares returns Σ v²; NaN or +Inf where v holds one.
func sumSquares(v []float64) float64 {
	var s0, s1, s2, s3 float64
	whole := len(v) &^ 3
	for i := 0; i < whole; i += 4 {
		r := v[i : i+4 : i+4]
		s0 += r[0] * r[0]
		s1 += r[1] * r[1]
		s2 += r[2] * r[2]
		s3 += r[3] * r[3]
	}
	for _, x := range v[whole:] {
		s0 += x * x
	}
	return (s0 + s1) + (s2 + s3)
}
