package nnls

import (
	"encoding/binary"
	"math"
	"math/bits"

	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// factor is W^½·a = Q·R by pivoted QR, cut at the numerical rank k.
type factor struct {
	m, n, k int       // rows used, columns, rank
	rows    []int     // which rows of the caller's matrix are used
	half    []float64 // √w of the rows used, scaled; nil where all are 1
	a       []float64 // m×n by rows
	ea      []int     // column j of a is W^½·a_j·2^−ea[j]
	ew      int       // half was scaled by 2^−ew
	q       []float64
	stride  int // of q, even; columns from k on are zero
	tri     triangle
}

// newFactor factors p.
func newFactor(p *problem) *factor {
	qr, pivot, tau := pivotedQR(p.a)
	tri := cutTriangle(qr, pivot)
	k := tri.k
	f := &factor{
		m: p.m, n: p.n, k: k, rows: p.rows, half: p.half,
		a: p.a.RawMatrix().Data, ea: p.ea, ew: p.ew, stride: padded(k), tri: tri,
	}
	if k == 0 {
		return f
	}
	qr.Cols = min(p.m, p.n)
	work := make([]float64, 1)
	lapack64.Orgqr(qr, tau, work, -1)
	work = make([]float64, int(work[0]))
	lapack64.Orgqr(qr, tau, work, len(work))
	f.q = make([]float64, p.m*f.stride)
	for i := range p.m {
		copy(f.q[i*f.stride:i*f.stride+k], qr.Data[i*qr.Stride:])
	}
	return f
}

// without returns the factor of the rows that are not gone, which must not be all.
func (f *factor) without(gone []byte) *factor {
	p := &problem{n: f.n, ew: f.ew}
	var at []int
	for i, r := range f.rows {
		if !bit(gone, i) {
			at = append(at, i)
			p.rows = append(p.rows, r)
			if f.half != nil {
				p.half = append(p.half, f.half[i])
			}
		}
	}
	p.m = len(at)
	p.a, _, p.ea, _ = scaledColumns(mat.NewDense(f.m, f.n, f.a), at, nil) // finite
	for j, e := range f.ea {
		p.ea[j] += e
	}
	return newFactor(p)
}

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
	tri triangle
	l   []float64 // k×k by rows, lower
	inv float64   // ‖L⁻¹‖²; the smallest eigenvalue of H is at least 1/inv
	h   []float64 // k × stride
	q   []float64 // gathered rows of Q
	v   []float64 // one column of them
}

func newReduced(f *factor) *reduced {
	return &reduced{
		tri: newTriangle(f.k, f.n, f.tri.order),
		l:   make([]float64, f.k*f.k),
		h:   make([]float64, f.k*f.stride),
		q:   make([]float64, block*f.stride),
		v:   make([]float64, block),
	}
}

// reduce fills d for the factor f without the rows in gone, missing in number,
// and reports whether H is fit for it.
func (d *reduced) reduce(f *factor, gone []byte, missing int) bool {
	d.gram(f, gone, 2*missing <= f.m)
	if !d.cholesky(f.k, f.stride) {
		return false
	}
	if d.inv = d.inverseNorm(f.k); !(d.inv <= 1/worstGap) {
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

// gram sets h to I minus the Gram matrix of the missing rows, or to that of the
// rows present.
func (d *reduced) gram(f *factor, gone []byte, fromMissing bool) {
	clear(d.h)
	s, count := f.stride, 0
	for at := 0; at < len(gone); at += 8 {
		word := binary.LittleEndian.Uint64(gone[at:])
		if !fromMissing {
			word = ^word
		}
		for ; word != 0; word &= word - 1 {
			i := at*8 + bits.TrailingZeros64(word)
			if i >= f.m {
				break
			}
			copy(d.q[count*s:(count+1)*s], f.q[i*s:(i+1)*s])
			if count++; count == block {
				d.addGram(f.k, s, count)
				count = 0
			}
		}
	}
	d.addGram(f.k, s, count)
	if fromMissing {
		for i := range d.h {
			d.h[i] = -d.h[i]
		}
		for i := range f.k {
			d.h[i*s+i]++
		}
	}
}

func (d *reduced) addGram(k, s, count int) {
	for c := range k {
		for i := range count {
			d.v[i] = d.q[i*s+c]
		}
		project(d.h[c*s:(c+1)*s], d.v[:count], d.q)
	}
}

func (d *reduced) cholesky(k, s int) bool {
	for i := range k {
		li := d.l[i*k : i*k+k]
		for j := range i + 1 {
			lj := d.l[j*k : j*k+k]
			v := d.h[i*s+j]
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

// inverseNorm returns ‖L⁻¹‖² (Frobenius).
func (d *reduced) inverseNorm(k int) float64 {
	sum := 0.0
	for c := range k {
		col := d.v[:0]
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
