package parafac

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// build sets H over theta.
func (n *newton) build() {
	n.plain, n.built = false, append(n.built[:0], n.theta...)
	m := len(n.theta)
	if cap(n.h) < m*m {
		n.h = make([]float64, m*m)
	}
	n.h = n.h[:m*m]
	clear(n.h)
	n.blocks()
	n.projectScores()
	n.pin()
}

// blocks adds Σ D'D.
func (n *newton) blocks() {
	f := n.f
	n.diagonal(n.hb, n.j, 0)
	n.diagonal(n.hc, n.k, n.nb)
	m := len(n.theta)
	gap := make(map[int32][]float64, len(n.gapCell))
	for x, q := range n.gapCell {
		gap[q] = n.gap[x*f*f : (x+1)*f*f]
	}
	for q := range n.p {
		j, k, w := int(n.cj[q]), int(n.ck[q]), n.w[q]*n.w[q]
		missing := gap[int32(q)]
		for x := range f {
			r := n.at[j*f+x]
			if r < 0 {
				continue
			}
			for y := range f {
				c := n.at[n.nb+k*f+y]
				if c < 0 {
					continue
				}
				g := n.ga[x*f+y]
				if missing != nil {
					g -= missing[x*f+y]
				}
				n.h[r*m+c] += w * g * n.c[k*f+x] * n.b[j*f+y]
			}
		}
	}
}

func (n *newton) diagonal(hs []float64, rows, from int) {
	f, m := n.f, len(n.theta)
	for r := range rows {
		for x := range f {
			i := n.at[from+r*f+x]
			if i < 0 {
				continue
			}
			for y := x; y < f; y++ {
				if c := n.at[from+r*f+y]; c >= 0 {
					n.h[i*m+c] += hs[r*f*f+x*f+y]
				}
			}
		}
	}
}

// derivatives sets mb and mc: (j,f) × g holds Σ_k w² c_kf c_kg b_jg.
func (n *newton) derivatives() {
	f := n.f
	n.mb, n.mc = make([]float64, n.j*f*f), make([]float64, n.k*f*f)
	n.sumsTo(n.mb, n.qs[:n.j*f], n.modeB())
	n.sumsTo(n.mc, n.qs[:n.k*f], n.modeC())
	for r, x := range n.mb {
		n.mb[r] = x * n.b[r/(f*f)*f+r%f]
	}
	for r, x := range n.mc {
		n.mc[r] = x * n.c[r/(f*f)*f+r%f]
	}
}

// row of D'K for entry e, without the score.
func (n *newton) derivative(e int) []float64 {
	f := n.f
	if e < n.nb {
		return n.mb[e*f : (e+1)*f]
	}
	return n.mc[(e-n.nb)*f : (e-n.nb+1)*f]
}

// projectScores subtracts the part of D that the scores take up. Samples without
// gaps enter together through W_fg = Σ_i a_if a_ig (K'K)⁻¹ over each sample's own
// positive scores, those with gaps one by one.
func (n *newton) projectScores() {
	n.derivatives()
	f, m := n.f, len(n.theta)
	w := make([]float64, f*f*f*f)
	var rest []int
	for i := range n.i {
		if len(n.gaps[i]) > 0 {
			rest = append(rest, i)
			continue
		}
		inv := n.inverse(i)
		a := n.a[i*f : (i+1)*f]
		for x, ax := range a {
			for y, ay := range a {
				if t := ax * ay; t != 0 {
					axpy(t, inv, w[(x*f+y)*f*f:(x*f+y+1)*f*f])
				}
			}
		}
	}
	v := make([]float64, f*f)
	for r, e := range n.theta {
		x, d := e%f, n.derivative(e)
		for y := range f {
			for g := range f {
				v[y*f+g] = dot(d, w[(x*f+y)*f*f+g*f:(x*f+y)*f*f+(g+1)*f])
			}
		}
		for c := r; c < m; c++ {
			y := n.theta[c] % f
			n.h[r*m+c] -= dot(v[y*f:(y+1)*f], n.derivative(n.theta[c]))
		}
	}
	n.projectGappy(rest)
}

// inverse returns (K_i'K_i)⁻¹ over the columns with a positive score (all when
// signs are free), zero elsewhere.
func (n *newton) inverse(i int) []float64 {
	f := n.f
	if n.inv == nil {
		n.inv = make([]float64, 2*f*f)
	}
	g, out := n.inv[:f*f], n.inv[f*f:]
	n.gramTo(g, i)
	clear(out)
	var idx []int
	for x := range f {
		if n.free || n.a[i*f+x] > 0 {
			idx = append(idx, x)
		}
	}
	k := len(idx)
	l, col := make([]float64, k*k), make([]float64, k)
	for a, x := range idx {
		for b, y := range idx {
			l[a*k+b] = g[x*f+y]
		}
	}
	if !cholesky(l, k, 1e-14) {
		return out
	}
	for b, y := range idx {
		clear(col)
		col[b] = 1
		solveCholesky(l, col, k)
		for a, x := range idx {
			out[x*f+y] = col[a]
		}
	}
	return out
}

// projectGappy subtracts T'T, where T stacks L_i⁻¹K_i'D_i for the samples.
func (n *newton) projectGappy(samples []int) {
	const batch = 64
	f, m := n.f, len(n.theta)
	for len(samples) > 0 {
		now := samples[:min(batch, len(samples))]
		samples = samples[len(now):]
		t := make([]float64, len(now)*f*m)
		for x, i := range now {
			n.scoreRows(t[x*f*m:(x+1)*f*m], i)
		}
		g := blas64.General{Rows: len(now) * f, Cols: m, Stride: m, Data: t}
		blas64.Gemm(blas.Trans, blas.NoTrans, -1, g, g, 1, blas64.General{Rows: m, Cols: m, Stride: m, Data: n.h})
	}
}

// scoreRows writes L⁻¹K_i'D_i, F × n, with LL' = K_i'K_i over the positive
// scores.
func (n *newton) scoreRows(t []float64, i int) {
	f, m := n.f, len(n.theta)
	v := n.scoreSlope(i)
	inv := append([]float64(nil), n.inverse(i)...)
	// inv = R'R with R upper from its Cholesky factor, so T = R·V'.
	l := inv
	for x := range f {
		if l[x*f+x] == 0 {
			l[x*f+x] = 1e-300
		}
	}
	if !cholesky(l, f, 1e-14) {
		return
	}
	for c, e := range n.theta {
		for y := range f {
			var s float64
			for x := y; x < f; x++ {
				s += l[x*f+y] * v[e*f+x]
			}
			t[y*m+c] = s
		}
	}
}

// scoreSlope returns D_i'K_i, all entries × F, of a sample with gaps.
func (n *newton) scoreSlope(i int) []float64 {
	f := n.f
	v := make([]float64, len(n.at)*f)
	a := n.a[i*f : (i+1)*f]
	for e := range n.at {
		axpy(a[e%f], n.derivative(e), v[e*f:(e+1)*f])
	}
	for _, q := range n.gaps[i] {
		j, k, w := int(n.cj[q]), int(n.ck[q]), n.w[q]*n.w[q]
		for x := range f {
			db, dc := w*a[x]*n.c[k*f+x], w*a[x]*n.b[j*f+x]
			vb, vc := v[(j*f+x)*f:(j*f+x+1)*f], v[(n.nb+k*f+x)*f:(n.nb+k*f+x+1)*f]
			for y := range f {
				kt := n.b[j*f+y] * n.c[k*f+y]
				vb[y] -= db * kt
				vc[y] -= dc * kt
			}
		}
	}
	return v
}

// pin takes away the freedom of scale: each column of b and c can trade scale
// with the scores, along which H is zero.
func (n *newton) pin() {
	f, m := n.f, len(n.theta)
	for x := range f {
		for _, mode := range [][2]int{{0, n.j}, {n.nb, n.k}} {
			n.pinColumn(x, mode[0], mode[1], f, m)
		}
	}
}

func (n *newton) pinColumn(x, from, rows, f, m int) {
	var idx []int
	var vals []float64
	var top, ss float64
	for r := range rows {
		e := from + r*f + x
		v, fixed := n.entry(e)
		if fixed && *v != 0 {
			return // a held column keeps its scale
		}
		if i := n.at[e]; i >= 0 {
			idx, vals = append(idx, i), append(vals, *v)
			ss += *v * *v
			top = math.Max(top, n.h[i*m+i])
		}
	}
	if ss == 0 {
		return
	}
	for a, i := range idx {
		for b := a; b < len(idx); b++ {
			n.h[i*m+idx[b]] += top / ss * vals[a] * vals[b]
		}
	}
}
