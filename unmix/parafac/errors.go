package parafac

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// influence is by how much each sample moves the loadings: row i is H⁺g_i, the
// change of every entry that can move when sample i is left out, to first order
// (infinitesimal jackknife, Jaeckel 1972; Efron 1982). Their products summed over
// the samples are the covariance of the loadings.
type influence struct {
	*newton
	d []float64 // I × n
}

// influence needs a factored H at the optimum. Without one, or when two
// components share one so that errors mean nothing, all moves are zero.
func (n *newton) influence() *influence {
	m := len(n.theta)
	in := &influence{newton: n, d: make([]float64, n.i*m)}
	if m == 0 || n.chol.N != m || n.shared() {
		return in
	}
	// A sample's residuals are smaller for its having been fitted.
	h := n.leverage()
	lapack64.Potri(n.triangle()) // in place: chol is not a factor any more
	inv := blas64.General{Rows: m, Cols: m, Stride: m, Data: n.chol.Data}
	for r := range m {
		for c := range r {
			inv.Data[r*m+c] = inv.Data[c*m+r]
		}
	}
	const batch = 256
	g := make([]float64, batch*m)
	for at := 0; at < n.i; at += batch {
		rows := min(batch, n.i-at)
		for i := range rows {
			n.sampleGradientTo(g[i*m:(i+1)*m], at+i)
			scaleBy(g[i*m:(i+1)*m], 1/math.Sqrt(math.Max(1-h[at+i], 0.05)))
		}
		blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, blas64.General{Rows: rows, Cols: m, Stride: m, Data: g}, inv,
			0, blas64.General{Rows: rows, Cols: m, Stride: m, Data: in.d[at*m:]})
	}
	return in
}

// leverage is the diagonal of A(A'A)⁻¹A', I; zero where A'A is singular.
func (n *newton) leverage() []float64 {
	h, f := make([]float64, n.i), n.f
	l := append([]float64(nil), n.ga...)
	if !cholesky(l, f, 1e-14) {
		return h
	}
	v := make([]float64, f)
	for i := range h {
		copy(v, n.a[i*f:(i+1)*f])
		forward(l, v, f)
		h[i] = sumSquares(v)
	}
	return h
}

func scaleBy(x []float64, by float64) {
	for i := range x {
		x[i] *= by
	}
}

// sampleGradientTo writes the part of the gradient that sample i brings, over
// theta.
func (n *newton) sampleGradientTo(dst []float64, i int) {
	f := n.f
	full, r := n.scratch[:len(n.at)], n.scratch[len(n.at):]
	clear(full)
	n.residualTo(r, i)
	a := n.a[i*f : (i+1)*f]
	for q, e := range r {
		e *= n.w[q]
		j, k := int(n.cj[q])*f, int(n.ck[q])*f
		b, c := n.b[j:j+f], n.c[k:k+f]
		gb, gc := full[j:j+f], full[n.nb+k:n.nb+k+f]
		for x, v := range a {
			gb[x] -= e * v * c[x]
			gc[x] -= e * v * b[x]
		}
	}
	for x, e := range n.theta {
		dst[x] = full[e]
	}
}

// loadingSE returns the standard errors of b and of c at unit norm.
func (in *influence) loadingSE() (sb, sc []float64) {
	all := make([]float64, len(in.at))
	m := len(in.theta)
	for x, e := range in.theta {
		var v float64
		for i := range in.i {
			v += in.d[i*m+x] * in.d[i*m+x]
		}
		all[e] = math.Sqrt(v)
	}
	return all[:in.nb], all[in.nb:]
}

// slopes returns, for the move of sample l, Y_fg = Σ over the loadings of
// component f of D'K·move, so that K_i'D_i·move is a_i'Y for a sample without
// gaps.
func (in *influence) slopes(l int) []float64 {
	f, m := in.f, len(in.theta)
	y := make([]float64, f*f)
	for x, e := range in.theta {
		if v := in.d[l*m+x]; v != 0 {
			axpy(v, in.derivative(e), y[e%f*f:(e%f+1)*f])
		}
	}
	return y
}

// scoreSE returns the standard errors, I × F in the cube's unit, of the scores
// of maximum-1 loadings: noise of the sample's own cells and the loadings' errors
// together. peakB and peakC are the rows where each component has its maximum.
func (in *influence) scoreSE(peakB, peakC []int) []float64 {
	f, m := in.f, len(in.theta)
	out := make([]float64, in.i*f)
	if in.mb == nil {
		return out
	}
	ys, peaks := make([]float64, in.i*f*f), make([]float64, in.i*f)
	for l := range in.i {
		copy(ys[l*f*f:], in.slopes(l))
		for x := range f {
			b, c := in.b[peakB[x]*f+x], in.c[peakC[x]*f+x]
			peaks[l*f+x] = in.move(l, m, peakB[x]*f+x)*c + b*in.move(l, m, in.nb+peakC[x]*f+x)
		}
	}
	moments := in.moments(ys, peaks)
	for i := range in.i {
		in.sampleSE(out[i*f:(i+1)*f], i, ys, peaks, moments, peakB, peakC)
	}
	return out
}

// moments sums u·u' over the moves, u being a move's F × F slopes and F peaks:
// what a sample without gaps needs of them, so that the work for all errors is
// in proportion to the samples and not to their square.
func (in *influence) moments(ys, peaks []float64) []float64 {
	f := in.f
	n := f*f + f
	s, u := make([]float64, n*n), make([]float64, n)
	for l := range in.i {
		copy(u, ys[l*f*f:(l+1)*f*f])
		copy(u[f*f:], peaks[l*f:(l+1)*f])
		for x, v := range u {
			axpy(v, u, s[x*n:(x+1)*n])
		}
	}
	return s
}

// momentSE adds to v the loadings' share of the variance of sample i's scores.
func (in *influence) momentSE(v, height, inv, a, moments []float64) {
	f := in.f
	n := f*f + f
	c := make([]float64, n)
	for x := range f {
		clear(c)
		for y, ay := range a {
			axpy(-height[x]*ay, inv[x*f:(x+1)*f], c[y*f:(y+1)*f])
		}
		c[f*f+x] = a[x]
		for y, w := range c {
			if w != 0 {
				v[x] += w * dot(c, moments[y*n:(y+1)*n])
			}
		}
	}
}

func (in *influence) move(l, m, e int) float64 {
	if x := in.at[e]; x >= 0 {
		return in.d[l*m+x]
	}
	return 0
}

func (in *influence) sampleSE(out []float64, i int, ys, peaks, moments []float64, peakB, peakC []int) {
	f := in.f
	inv := append([]float64(nil), in.inverse(i)...)
	dof := math.Max(1, float64(in.p-len(in.gaps[i])-f))
	in.residualTo(in.scratch[:in.p], i)
	s2 := sumSquares(in.scratch[:in.p]) / dof
	a := in.a[i*f : (i+1)*f]
	height := make([]float64, f)
	v := make([]float64, f)
	for x := range f {
		height[x] = in.b[peakB[x]*f+x] * in.c[peakC[x]*f+x]
		v[x] = height[x] * height[x] * s2 * inv[x*f+x]
	}
	if len(in.gaps[i]) == 0 {
		in.momentSE(v, height, inv, a, moments)
	} else {
		in.gappySE(v, height, inv, i, ys, peaks)
	}
	for x := range f {
		out[x] = in.scale[i] * math.Sqrt(math.Max(0, v[x]))
	}
}

// gappySE is momentSE for a sample with gaps, whose slopes lack their cells.
func (in *influence) gappySE(v, height, inv []float64, i int, ys, peaks []float64) {
	f := in.f
	a, kd := in.a[i*f:(i+1)*f], make([]float64, f)
	for l := range in.i {
		y := ys[l*f*f : (l+1)*f*f]
		clear(kd)
		for x, ax := range a {
			axpy(ax, y[x*f:(x+1)*f], kd)
		}
		in.gapSlope(kd, i, l)
		for x := range f {
			d := a[x]*peaks[l*f+x] - height[x]*dot(inv[x*f:(x+1)*f], kd)
			v[x] += d * d
		}
	}
}

// gapSlope takes the cells that sample i lacks out of K_i'D_i·move.
func (in *influence) gapSlope(kd []float64, i, l int) {
	f, m := in.f, len(in.theta)
	for _, q := range in.gaps[i] {
		j, k, w := int(in.cj[q])*f, int(in.ck[q])*f, in.w[q]*in.w[q]
		var d float64
		for x, ax := range in.a[i*f : (i+1)*f] {
			d += ax * (in.move(l, m, j+x)*in.c[k+x] + in.b[j+x]*in.move(l, m, in.nb+k+x))
		}
		for x := range f {
			kd[x] -= w * d * in.b[j+x] * in.c[k+x]
		}
	}
}
