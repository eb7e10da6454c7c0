package parafac

import (
	"math"
	"math/rand/v2"
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
	q, cells := sketch(x, r, seed), len(x[0])
	rows := make([]float64, r*cells)
	for pass := range 2 {
		if pass > 0 {
			rowsTimesTo(q, x, rows, r)
			clear(rows)
		}
		orthonormal(q, len(x), r)
		addTransposed(rows, q, x, r)
	}
	for n := range x {
		b.u = append(b.u, q[n*r:(n+1)*r])
	}
	for n := range r {
		b.rows = append(b.rows, rows[n*cells:(n+1)*cells])
	}
	return b
}

// sketch adds every cell, with a random sign, to one of r columns: a random
// product that costs one reading of x. It returns rows × r.
func sketch(x [][]float64, r int, seed uint64) []float64 {
	rnd := rand.New(rand.NewPCG(seed, 1<<32))
	n := len(x[0])
	to, sign := make([]int, n), make([]float64, n)
	for q := range to {
		to[q], sign[q] = rnd.IntN(r), float64(2*rnd.IntN(2)-1)
	}
	y := make([]float64, len(x)*r)
	for i, v := range x {
		d := y[i*r : (i+1)*r]
		for q, e := range v {
			d[to[q]] += sign[q] * e
		}
	}
	return y
}

// orthonormal replaces the columns of y, n × r, by an orthonormal basis of their
// space, by Gram–Schmidt done twice. A column that depends on the others becomes
// zero.
func orthonormal(y []float64, n, r int) {
	col := make([][]float64, r)
	for c := range col {
		col[c] = make([]float64, n)
		for i := range n {
			col[c][i] = y[i*r+c]
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
			y[i*r+c] = col[c][i]
		}
	}
}

// stacked is the data of some bases side by side: nothing is mixed across them.
// raw are samples that stay as they are, beside.
func (p *problem) stacked(bases []*basis, raw []int) *data {
	d := &data{problem: p, raw: raw}
	for _, b := range bases {
		d.bases, d.at = append(d.bases, b), append(d.at, len(d.rows))
		d.rows = append(d.rows, b.rows...)
		d.x2 += b.x2
	}
	d.r = len(d.rows)
	for _, i := range raw {
		d.rows = append(d.rows, p.x[i])
		d.x2 += sumSquares(p.x[i])
	}
	d.finish()
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
