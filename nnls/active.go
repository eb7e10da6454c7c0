package nnls

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// active is the active-set method of Lawson and Hanson (1974, ch. 23) for
// min ‖t·x − c‖, x ≥ 0, with t of k rows and n columns. It keeps t and c
// multiplied by the orthogonal matrix that makes the free columns, in their
// order, upper triangular: a variable that becomes free costs one Householder
// reflection of what lies below, one that becomes zero a row of Givens
// rotations. The residual is then the tail of c, so the dual variables
//
//	w_j = Σ_{i ≥ p} t_ij·c_i
//
// (p free variables) suffer no cancellation with the fit.
type active struct {
	k, n       int
	t          []float64 // k×n by columns, rotated
	c          []float64 // k, rotated
	norm       []float64 // n, of the columns
	normB      float64   // of the right-hand side, of which c may be a part
	err, loss  float64   // of the triangle
	order      []int     // the free variables, in the order of the triangle
	free       []bool    // n
	banned     []bool    // n: cannot become free before something else changes
	x          []float64 // n, feasible
	s          []float64 // least squares on the free variables, in their order
	d          []float64 // n, a correction
	iterations int
}

func newActive(k, n int) *active {
	return &active{
		k: k, n: n,
		t: make([]float64, k*n), c: make([]float64, k),
		norm: make([]float64, n), order: make([]int, 0, k),
		free: make([]bool, n), banned: make([]bool, n),
		x: make([]float64, n), s: make([]float64, k), d: make([]float64, n),
	}
}

// load starts a new problem with all variables zero.
func (a *active) load(t *triangle, c []float64, normB float64) {
	copy(a.t, t.t)
	copy(a.c, c)
	copy(a.norm, t.norm)
	a.normB, a.err, a.loss = normB, t.err, t.loss
	a.order = a.order[:0]
	a.iterations = 0
	clear(a.free)
	clear(a.banned)
	clear(a.x)
}

func (a *active) column(j int) []float64 { return a.t[j*a.k : (j+1)*a.k] }

// warm frees the marked variables and takes back those that least squares makes
// negative, until x is feasible.
func (a *active) warm(guess []bool) {
	for j, g := range guess {
		if g && a.tail(j) > a.negligible(j) {
			a.add(j)
		}
	}
	a.settle()
}

// warmAll is warm with the columns that the triangle was made of, which costs
// no reflection.
func (a *active) warmAll(t *triangle) {
	a.order = append(a.order, t.order...)
	for _, j := range a.order {
		a.free[j] = true
	}
	a.settle()
}

func (a *active) settle() {
	for {
		a.solve()
		dropped := false
		for q := len(a.order) - 1; q >= 0; q-- {
			if !(a.s[q] > 0) {
				a.remove(q)
				a.iterations++
				dropped = true
			}
		}
		if !dropped {
			a.take()
			return
		}
	}
}

// run improves the feasible x until it is optimal or limit changes were made.
func (a *active) run(limit int) Status {
	for {
		j := a.entering()
		if j < 0 {
			return Optimal
		}
		if a.iterations >= limit {
			return IterationLimit
		}
		a.iterations++
		a.add(j)
		a.solve()
		if !(a.s[len(a.order)-1] > 0) {
			a.remove(len(a.order) - 1)
			a.banned[j] = true
			continue
		}
		clear(a.banned)
		a.retreat()
	}
}

// retreat moves x towards the least-squares answer s until s is feasible; a
// variable that reaches zero on the way leaves.
func (a *active) retreat() {
	for {
		alpha, out := 1.0, -1
		for q, j := range a.order {
			if a.s[q] <= 0 {
				if f := a.x[j] / (a.x[j] - a.s[q]); f < alpha || out < 0 {
					alpha, out = f, q
				}
			}
		}
		if out < 0 {
			a.take()
			return
		}
		for q, j := range a.order {
			a.x[j] += alpha * (a.s[q] - a.x[j])
		}
		a.x[a.order[out]] = 0
		for q := len(a.order) - 1; q >= 0; q-- {
			if j := a.order[q]; a.x[j] <= 0 {
				a.x[j] = 0
				a.remove(q)
				a.iterations++
			}
		}
		a.solve()
	}
}

// take makes s the answer.
func (a *active) take() {
	clear(a.x)
	for q, j := range a.order {
		a.x[j] = a.s[q]
	}
}

// entering returns the variable whose dual, relative to the norm of its column,
// is largest above rounding error, or −1.
func (a *active) entering() int {
	p := len(a.order)
	rest := norm2(a.c[p:])
	best, at := 0.0, -1
	for j := 0; j < a.n; j++ {
		if a.free[j] || a.banned[j] {
			continue
		}
		tail := a.tail(j)
		if tail <= a.negligible(j) {
			continue // depends on the free columns: its dual is zero
		}
		w := floats.Dot(a.column(j)[p:], a.c[p:])
		// The rounding error of w: of the column's tail times c, of the
		// column times c's tail.
		if w <= 8*eps*(tail*a.normB+a.norm[j]*rest) {
			continue
		}
		if w /= a.norm[j]; w > best {
			best, at = w, j
		}
	}
	return at
}

func (a *active) tail(j int) float64 { return norm2(a.column(j)[len(a.order):]) }

// negligible is the length below which the part of column j that is orthogonal
// to the free columns is rounding error.
func (a *active) negligible(j int) float64 { return a.err * a.loss * a.norm[j] }

// add frees variable j: one Householder reflection.
func (a *active) add(j int) {
	p := len(a.order)
	v := a.column(j)[p:]
	norm := norm2(v)
	if v[0] > 0 {
		norm = -norm
	}
	// v − norm·e₁ is the vector of the reflection, which maps v on norm·e₁.
	v[0] -= norm
	scale := v[0] * norm // −½·‖v − norm·e₁‖²
	for l := 0; l < a.n; l++ {
		if !a.free[l] && l != j {
			reflect(a.column(l)[p:], v, scale)
		}
	}
	reflect(a.c[p:], v, scale)
	v[0] = norm
	clear(v[1:])
	a.order = append(a.order, j)
	a.free[j] = true
}

func reflect(u, v []float64, scale float64) {
	f := floats.Dot(v, u) / scale
	for i, x := range v {
		u[i] += f * x
	}
}

// remove makes the variable at place q of the order zero: Givens rotations.
func (a *active) remove(q int) {
	j := a.order[q]
	a.order = append(a.order[:q], a.order[q+1:]...)
	for i := q; i < len(a.order); i++ {
		pivot := a.column(a.order[i])
		r := math.Hypot(pivot[i], pivot[i+1])
		if r == 0 {
			continue
		}
		cos, sin := pivot[i]/r, pivot[i+1]/r
		for _, l := range a.order[i:] {
			rotate(a.column(l), i, cos, sin)
		}
		for l := 0; l < a.n; l++ {
			if !a.free[l] || l == j {
				rotate(a.column(l), i, cos, sin)
			}
		}
		rotate(a.c, i, cos, sin)
		pivot[i+1] = 0
	}
	a.free[j] = false
}

func rotate(v []float64, i int, cos, sin float64) {
	v[i], v[i+1] = cos*v[i]+sin*v[i+1], cos*v[i+1]-sin*v[i]
}

// solve writes least squares on the free variables into s.
func (a *active) solve() {
	copy(a.s, a.c[:len(a.order)])
	for q := len(a.order) - 1; q >= 0; q-- {
		col := a.column(a.order[q])
		a.s[q] /= col[q]
		for l, x := range col[:q] {
			a.s[l] -= x * a.s[q]
		}
	}
}
