package parafac

import (
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

const (
	basisRank    = 40  // r: a component in 3 of 200 bottles is lost at 20 (NUMERICS 2a)
	compressFrom = 160 // samples; below that the samples themselves are few enough
)

// basis is what stands for some samples: row n of theirs is about u[n]·rows.
type basis struct {
	samples []int
	u       [][]float64 // n × r
	rows    [][]float64 // r × P
	x2      float64
}

// compress finds the r-dimensional space that holds most of the rows x, by two
// passes of subspace iteration from a random sketch of the cells. With r rows or
// fewer the rows are their own basis.
func compress(x [][]float64, samples []int, r int, seed uint64) *basis {
	b := &basis{samples: samples}
	for _, v := range x {
		b.x2 += sumSquares(v)
	}
	if len(x) <= r {
		b.rows = x
		for n := range x {
			u := make([]float64, len(x))
			u[n] = 1
			b.u = append(b.u, u)
		}
		return b
	}
	q := orthonormal(sketch(x, r, seed))
	rows := transposeTimes(q, x)
	q = orthonormal(timesTranspose(x, rows))
	rows = transposeTimes(q, x)
	for n := range x {
		b.u = append(b.u, q.Data[n*r:(n+1)*r])
	}
	for n := range r {
		b.rows = append(b.rows, rows.Data[n*rows.Stride:(n+1)*rows.Stride])
	}
	return b
}

// sketch adds every cell, with a random sign, to one of r columns.
func sketch(x [][]float64, r int, seed uint64) blas64.General {
	rnd := rand.New(rand.NewPCG(seed, 1<<32))
	n := len(x[0])
	to, sign := make([]int, n), make([]float64, n)
	for q := range to {
		to[q], sign[q] = rnd.IntN(r), float64(2*rnd.IntN(2)-1)
	}
	y := blas64.General{Rows: len(x), Cols: r, Stride: r, Data: make([]float64, len(x)*r)}
	for i, v := range x {
		d := y.Data[i*r : (i+1)*r]
		for q, e := range v {
			d[to[q]] += sign[q] * e
		}
	}
	return y
}

// orthonormal replaces the columns of y by an orthonormal basis of their space,
// by Gram–Schmidt done twice. A column that depends on the others becomes zero.
func orthonormal(y blas64.General) blas64.General {
	n, r := y.Rows, y.Cols
	col := make([][]float64, r)
	for c := range col {
		col[c] = make([]float64, n)
		for i := range n {
			col[c][i] = y.Data[i*y.Stride+c]
		}
		before := norm(col[c])
		for range 2 {
			for p := range c {
				axpy(-dot(col[p], col[c]), col[p], col[c])
			}
		}
		t := norm(col[c])
		if t <= 1e-13*before {
			t = math.Inf(1)
		}
		for i := range n {
			col[c][i] /= t
			y.Data[i*y.Stride+c] = col[c][i]
		}
	}
	return y
}

// stack copies rows into one matrix, a few at a time, for the matrix products.
const stackRows = 256

func stack(x [][]float64) blas64.General {
	n := len(x[0])
	g := blas64.General{Rows: len(x), Cols: n, Stride: n, Data: make([]float64, len(x)*n)}
	for i, v := range x {
		copy(g.Data[i*n:], v)
	}
	return g
}

// transposeTimes returns Q'·X, r × P.
func transposeTimes(q blas64.General, x [][]float64) blas64.General {
	n := len(x[0])
	out := blas64.General{Rows: q.Cols, Cols: n, Stride: n, Data: make([]float64, q.Cols*n)}
	for at := 0; at < len(x); at += stackRows {
		part := x[at:min(at+stackRows, len(x))]
		sub := blas64.General{Rows: len(part), Cols: q.Cols, Stride: q.Stride, Data: q.Data[at*q.Stride:]}
		blas64.Gemm(blas.Trans, blas.NoTrans, 1, sub, stack(part), 1, out)
	}
	return out
}

// timesTranspose returns X·R', n × r.
func timesTranspose(x [][]float64, r blas64.General) blas64.General {
	out := blas64.General{Rows: len(x), Cols: r.Rows, Stride: r.Rows, Data: make([]float64, len(x)*r.Rows)}
	for at := 0; at < len(x); at += stackRows {
		part := x[at:min(at+stackRows, len(x))]
		sub := blas64.General{Rows: len(part), Cols: r.Rows, Stride: r.Rows, Data: out.Data[at*r.Rows:]}
		blas64.Gemm(blas.NoTrans, blas.Trans, 1, stack(part), r, 0, sub)
	}
	return out
}

// stacked is the data of some bases side by side: nothing is mixed across them.
// raw are samples that stay as they are, beside.
func (p *problem) stacked(bases []*basis, raw []int) *data {
	d := &data{problem: p, raw: raw}
	for _, b := range bases {
		for n, i := range b.samples {
			d.mixed, d.u, d.uAt = append(d.mixed, i), append(d.u, b.u[n]), append(d.uAt, len(d.rows))
		}
		d.rows = append(d.rows, b.rows...)
		d.x2 += b.x2
	}
	d.r = len(d.rows)
	for _, i := range raw {
		d.rows = append(d.rows, p.x[i])
		d.x2 += sumSquares(p.x[i])
	}
	d.listGaps()
	return d
}

// merge compresses bases once more into one.
func merge(bases []*basis, r int, seed uint64) *basis {
	var rows [][]float64
	for _, b := range bases {
		rows = append(rows, b.rows...)
	}
	if len(rows) <= r {
		return joined(bases, rows)
	}
	top := compress(rows, make([]int, len(rows)), r, seed)
	out := &basis{rows: top.rows}
	at := 0
	for _, b := range bases {
		out.x2 += b.x2
		for n, i := range b.samples {
			u := make([]float64, len(top.rows))
			for q, v := range b.u[n] {
				axpy(v, top.u[at+q], u)
			}
			out.samples, out.u = append(out.samples, i), append(out.u, u)
		}
		at += len(b.rows)
	}
	return out
}

func joined(bases []*basis, rows [][]float64) *basis {
	out := &basis{rows: rows}
	at := 0
	for _, b := range bases {
		out.x2 += b.x2
		for n, i := range b.samples {
			u := make([]float64, len(rows))
			copy(u[at:], b.u[n])
			out.samples, out.u = append(out.samples, i), append(out.u, u)
		}
		at += len(b.rows)
	}
	return out
}
