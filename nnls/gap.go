package nnls

import (
	"encoding/binary"
	"math"
	"math/bits"

	"gonum.org/v1/gonum/floats"
)

// worstGap is the least share of its information that a direction may keep when
// rows are missing, as the smallest eigenvalue of H = I − Q_gᵀ·Q_g. Below it the
// difference has lost too many digits.
const worstGap = 1e-6

// reduced is the problem of a sample with missing rows. The rows present of Q
// have the Gram matrix H = L·Lᵀ, so that
//
//	min ‖Q_p·R·x − b_p‖  is  min ‖LᵀR·x − L⁻¹·Q_pᵀ·b_p‖.
//
// H comes from the missing rows alone, or from those present where they are
// fewer.
type reduced struct {
	tri  triangle
	l    []float64 // k×k by rows, lower
	h    []float64 // k×k by rows, upper
	q    panel     // gathered rows of Q, up to two blocks
	rows []int32   // of a block
}

func newReduced(f *factor) *reduced {
	return &reduced{
		tri:  newTriangle(f.k, f.n, f.tri.order),
		l:    make([]float64, f.k*f.k),
		h:    make([]float64, f.k*f.k),
		q:    panel{make([]float64, 2*block*f.k), 2 * block},
		rows: make([]int32, 0, block),
	}
}

// reduce fills d for the factor f without the rows in gone, missing in number,
// and reports whether H is fit for it.
func (d *reduced) reduce(f *factor, gone []byte, missing int) bool {
	d.gram(f, gone, 2*missing <= f.m)
	if !d.cholesky(f.k) {
		return false
	}
	d.tri.err, d.tri.loss = f.tri.err, d.inverseNorm(f.k)
	if !(d.tri.loss <= 1/worstGap) {
		return false
	}
	k := f.k
	for j := range f.n {
		from, to := f.tri.column(j), d.tri.column(j)
		for i := range to {
			v := 0.0
			for l := i; l < k; l++ {
				v += d.l[l*k+i] * from[l]
			}
			to[i] = v
		}
	}
	d.tri.measure()
	return true
}

// gram sets the upper triangle of h to I minus the Gram matrix of the missing
// rows, or to that of the rows present.
func (d *reduced) gram(f *factor, gone []byte, fromMissing bool) {
	clear(d.h)
	count := 0
	for at := 0; at < f.m; at += block {
		p := f.q.at(at)
		d.list(gone, at, p.ld, fromMissing)
		for c := range f.k {
			from, to := p.column(c, p.ld), d.q.column(c, count+len(d.rows))[count:]
			for t, i := range d.rows {
				to[t] = from[i]
			}
		}
		if count += len(d.rows); count > block {
			d.addGram(f, count)
			count = 0
		}
	}
	d.addGram(f, count)
	if fromMissing {
		for i := range d.h {
			d.h[i] = -d.h[i]
		}
		for i := range f.k {
			d.h[i*f.k+i]++
		}
	}
}

// list puts the rows of the block at a row that are gone, or those that are not,
// into rows, counted from there.
func (d *reduced) list(gone []byte, at, rows int, missing bool) {
	d.rows = d.rows[:0]
	for from := 0; from < rows; from += 64 {
		word := binary.LittleEndian.Uint64(gone[(at+from)/8:])
		if !missing {
			word = ^word
		}
		if left := rows - from; left < 64 {
			word &= 1<<left - 1
		}
		for ; word != 0; word &= word - 1 {
			d.rows = append(d.rows, int32(from+bits.TrailingZeros64(word)))
		}
	}
}

// addGram adds the products of the gathered columns.
func (d *reduced) addGram(f *factor, count int) {
	for j := range f.k {
		for i := j; i < f.k; i++ {
			d.h[j*f.k+i] += floats.Dot(d.q.column(j, count), d.q.column(i, count))
		}
	}
}

func (d *reduced) cholesky(k int) bool {
	for i := range k {
		li := d.l[i*k : i*k+k]
		for j := range i + 1 {
			lj := d.l[j*k : j*k+k]
			v := d.h[j*k+i]
			for l := range j {
				v -= li[l] * lj[l]
			}
			if i > j {
				li[j] = v / lj[j]
			} else if li[i] = math.Sqrt(v); !(v > 0) {
				return false
			}
		}
	}
	return true
}

// inverseNorm returns ‖L⁻¹‖² (Frobenius), at least k; the smallest eigenvalue of H
// is at least one by that.
func (d *reduced) inverseNorm(k int) float64 {
	sum := 0.0
	for c := range k {
		col := d.q.q[:0] // no longer needed
		for i := c; i < k; i++ {
			v := 0.0
			if i == c {
				v = 1
			}
			for l, x := range col {
				v -= d.l[i*k+c+l] * x
			}
			v /= d.l[i*k+i]
			sum += v * v
			col = append(col, v)
		}
	}
	return sum
}

// forward solves L·z = c in place.
func (d *reduced) forward(c []float64) {
	k := len(c)
	for i := range c {
		for l := range i {
			c[i] -= d.l[i*k+l] * c[l]
		}
		c[i] /= d.l[i*k+i]
	}
}

func bit(set []byte, i int) bool { return set[i>>3]&(1<<(i&7)) != 0 }

func setBit(set []byte, i int) { set[i>>3] |= 1 << (i & 7) }
