package parafac

import (
	"context"
	"math"
	"slices"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// newton is the last part of a fit: Gauss–Newton steps in the loadings with the
// scores projected out, on the samples themselves and with their true gaps. Its
// matrix, (J+K)·F square, is
//
//	H = Σ_i D_i'D_i − D_i'K_i (K_i'K_i)⁻¹ K_i'D_i
//
// where D_i holds the derivatives of sample i's cells by the loadings and K_i
// its model rows with the scores that are above zero. Common cells enter through
// F × F Gram matrices, so that no data are touched (NUMERICS 2e).
type newton struct {
	*als
	nb    int       // entries of b, before those of c
	theta []int     // entries that can move: index into b, or nb + index into c
	at    []int     // place of each entry in theta, −1 if it cannot move
	grad  []float64 // of ½ loss by every entry
	hb    []float64 // J × F × F: diagonal blocks, ridge included
	hc    []float64 // K × F × F
	h     []float64 // n × n, upper
	work  []float64 // n × n: what chol holds
	chol  blas64.Symmetric
	plain bool      // chol is the factor of H, all of it and without damping
	built []int     // theta of H
	mb    []float64 // (J·F) × F and (K·F) × F: D'K without the score in front
	mc    []float64
	inv   []float64 // F × F scratch
	delta float64   // certificate at the last gradient
}

func (s *als) newton() *newton {
	nb := s.j * s.f
	return &newton{als: s, nb: nb, at: make([]int, nb+s.k*s.f), grad: make([]float64, nb+s.k*s.f)}
}

// sigma2 is the residual variance of the scaled data.
func (n *newton) sigma2() float64 {
	cells := 0
	for i := range n.i {
		cells += n.p - len(n.gaps[i])
	}
	dof := float64(cells - len(n.theta) - n.i*n.f)
	return math.Max(n.loss, roundOff*n.x2) / math.Max(dof, 1)
}

// gradient solves for the scores and sets grad and the list of entries that can
// move: not fixed, and not held at zero by the sign constraint.
func (n *newton) gradient() {
	n.exactScores()
	n.project()
	hb, qb := n.normal(n.modeB())
	n.ridgeB()
	n.half(n.b, hb, qb, n.dampB, 0)
	hc, qc := n.normal(n.modeC())
	n.ridgeC()
	n.half(n.c, hc, qc, n.dampC, n.nb)
	n.theta = n.theta[:0]
	for e, g := range n.grad {
		x, fixed := n.entry(e)
		n.at[e] = -1
		if !fixed && (n.free || *x > 0 || g < 0) {
			n.at[e] = len(n.theta)
			n.theta = append(n.theta, e)
		}
	}
}

// half writes the gradient by one mode and adds the ridge to its matrices.
func (n *newton) half(x, hs, qs []float64, damped []bool, from int) {
	f := n.f
	lam := make([]float64, f)
	for at := 0; at < len(x); at += f {
		n.rowRidge(lam, damped, at)
		for u := range f {
			hs[at*f+u*f+u] += lam[u]
			n.grad[from+at+u] = dot(hs[at*f+u*f:at*f+u*f+f], x[at:at+f]) - qs[at+u]
		}
	}
	if from == 0 {
		n.hb = append(n.hb[:0], hs...)
	} else {
		n.hc = append(n.hc[:0], hs...)
	}
}

func (n *newton) entry(e int) (*float64, bool) {
	if e < n.nb {
		return &n.b[e], n.fixB != nil && n.fixB[e]
	}
	return &n.c[e-n.nb], n.fixC != nil && n.fixC[e-n.nb]
}

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

// factor factors H + damp·diag(H) over the entries of theta where keep is true
// (nil: all), leaving the others out. It says false where that is singular.
func (n *newton) factor(damp float64, keep []bool) bool {
	m := len(n.theta)
	if len(n.work) < m*m {
		n.work = make([]float64, m*m)
	}
	for try, shift := 0, damp; try < 4; try++ {
		h := n.work[:m*m]
		copy(h, n.h)
		for i := range m {
			h[i*m+i] *= 1 + shift
			if keep != nil && !keep[i] {
				clear(h[i*m+i+1 : (i+1)*m])
				for r := range i {
					h[r*m+i] = 0
				}
				h[i*m+i] = 1
			}
		}
		n.chol = blas64.Symmetric{N: m, Stride: m, Data: h, Uplo: blas.Upper}
		n.plain = shift == 0 && keep == nil
		if _, ok := lapack64.Potrf(n.chol); ok {
			return true
		}
		shift = math.Max(1e-12, shift*1e3)
	}
	return false
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

func (n *newton) triangle() blas64.Triangular {
	return blas64.Triangular{N: n.chol.N, Stride: n.chol.Stride, Data: n.chol.Data, Uplo: blas.Upper, Diag: blas.NonUnit}
}

// decrement factors H and sets delta. It says false where H is singular.
func (n *newton) decrement() bool {
	n.delta = math.Inf(1)
	if len(n.theta) == 0 || !n.plain && !n.factor(0, nil) {
		return false
	}
	step := n.solve(nil, nil)
	var d float64
	for i, e := range n.theta {
		d -= step[i] * n.grad[e]
	}
	n.delta = math.Sqrt(math.Max(d, 0) / n.sigma2())
	return true
}

// solve returns −H⁻¹g, where entries of theta not in keep move by to.
func (n *newton) solve(keep []bool, to []float64) []float64 {
	m := len(n.theta)
	step := make([]float64, m)
	for i, e := range n.theta {
		step[i] = -n.grad[e]
	}
	for i := range m {
		if keep == nil || keep[i] || to[i] == 0 {
			continue
		}
		for r := range m { // the others' share of a move that is decided
			step[r] -= n.h[min(r, i)*m+max(r, i)] * to[i]
		}
	}
	for i := range m {
		if keep != nil && !keep[i] {
			step[i] = to[i]
		}
	}
	lapack64.Potrs(n.triangle(), blas64.General{Rows: m, Cols: 1, Stride: 1, Data: step})
	return step
}

// bounded returns the step that minimises the quadratic model with no entry
// below zero: entries that would go there are set there and the others solved
// again, a few times.
func (n *newton) bounded(damp float64) []float64 {
	if !(damp == 0 && n.plain) && !n.factor(damp, nil) {
		return nil
	}
	step := n.solve(nil, nil)
	if n.free {
		return step
	}
	m := len(n.theta)
	keep, to := make([]bool, m), make([]float64, m)
	for i := range keep {
		keep[i] = true
	}
	for range recuts {
		cut := false
		for i, e := range n.theta {
			if x, _ := n.entry(e); keep[i] && *x+step[i] < 0 {
				keep[i], to[i], cut = false, -*x, true
			}
		}
		if !cut {
			break
		}
		if !n.factor(damp, keep) {
			return nil
		}
		step = n.solve(keep, to)
	}
	return step
}

const (
	newtonSteps = 40   // at most, 0 for a model that two components share
	recuts      = 3    // times a step is solved again with what went below zero set there
	certified   = 0.1  // δ of a converged fit
	goodEnough  = 1e-3 // δ at which the steps end
	goodForNow  = 0.03 // the same while a number of components is being chosen
)

// finish takes Gauss–Newton steps, damped as Levenberg and Marquardt do, until
// the certificate is enough or no step lowers the loss any more. H is built anew
// only when other entries move or the last step did little: near the end it stays
// what it was, and a step costs two readings of the samples.
func (n *newton) finish(ctx context.Context, steps int, enough float64) error {
	n.gradient()
	n.build()
	if !n.decrement() {
		return nil
	}
	damp, stale := 0.0, 0
	for range steps {
		if err := ctx.Err(); err != nil {
			return err
		}
		if n.delta <= enough {
			break
		}
		before := n.delta
		if damp = n.step(damp); math.IsInf(damp, 1) {
			break
		}
		n.iter++
		if !n.plain || !slices.Equal(n.theta, n.built) {
			n.build()
		}
		if !n.decrement() {
			return nil
		}
		if n.delta > 0.9*before {
			n.plain = false
			if stale++; stale > 3 {
				break
			}
		}
	}
	if !n.plain || !slices.Equal(n.theta, n.built) {
		n.build()
		n.decrement()
	}
	return nil
}

// step goes one step, with more damping until the loss falls, and returns the
// damping for the next one, infinite when none helped.
func (n *newton) step(damp float64) float64 {
	b, c, a, loss := append([]float64(nil), n.b...), append([]float64(nil), n.c...), append([]float64(nil), n.a...), n.loss
	theta, grad := append([]int(nil), n.theta...), append([]float64(nil), n.grad...)
	for range 4 {
		if move := n.bounded(damp); move != nil {
			for i, e := range n.theta {
				x, _ := n.entry(e)
				*x += move[i]
				if *x < 0 && !n.free {
					*x = 0
				}
			}
			n.unit()
			n.gradient()
			if n.loss <= loss+roundOff*n.x2 {
				if damp < 1e-6 {
					return 0
				}
				return damp / 10
			}
		}
		damp = math.Max(1e-4, damp*10)
		copy(n.b, b)
		copy(n.c, c)
		n.theta = append(n.theta[:0], theta...)
		copy(n.grad, grad)
	}
	copy(n.a, a)
	n.gradient()
	return math.Inf(1)
}
