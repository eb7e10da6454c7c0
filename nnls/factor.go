package nnls

import (
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// factor is W^½·a = Q·R by pivoted QR, cut at the numerical rank k.
type factor struct {
	m, n, k int       // rows used, columns, rank
	rows    []int     // which rows of the caller's matrix are used
	half    []float64 // √w of the rows used, scaled; nil where all are 1
	a       panels    // m×n
	ea      []int     // column j of a is W^½·a_j·2^−ea[j]
	ew      int       // half was scaled by 2^−ew
	q       panels    // m×k
	tri     triangle
}

// newFactor factors p.
func newFactor(p *problem) *factor {
	qr, pivot, tau := pivotedQR(p.a)
	tri := cutTriangle(qr, pivot)
	k := tri.k
	f := &factor{
		m: p.m, n: p.n, k: k, rows: p.rows, half: p.half,
		a: newPanels(p.a), ea: p.ea, ew: p.ew, tri: tri,
	}
	if k == 0 {
		return f
	}
	qr.Cols = min(p.m, p.n)
	work := make([]float64, 1)
	lapack64.Orgqr(qr, tau, work, -1)
	work = make([]float64, int(work[0]))
	lapack64.Orgqr(qr, tau, work, len(work))
	var q mat.Dense
	qr.Cols = k
	q.SetRawMatrix(qr)
	f.q = newPanels(&q)
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
	p.a, _, p.ea, _ = scaledColumns(f.a, at, nil) // finite
	for j, e := range f.ea {
		p.ea[j] += e
	}
	return newFactor(p)
}
