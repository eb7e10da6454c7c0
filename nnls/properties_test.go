package nnls_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"tarnlight/nnls"
)

// anyProblem draws shapes and values that make active sets hard: wide and tall,
// repeated and zero columns, small integers that tie, scales apart.
func anyProblem(t *rapid.T) (a *mat.Dense, b []float64) {
	m, n := rapid.IntRange(1, 12).Draw(t, "m"), rapid.IntRange(1, 9).Draw(t, "n")
	value := rapid.Map(rapid.Float64Range(-1e3, 1e3), func(v float64) float64 {
		if math.Abs(v) < 1e-100 {
			return 0 // an answer beyond 1e308 is an error
		}
		return v
	})
	if rapid.Bool().Draw(t, "integers") {
		value = rapid.Map(rapid.IntRange(-3, 3), func(i int) float64 { return float64(i) })
	}
	a = mat.NewDense(m, n, rapid.SliceOfN(value, m*n, m*n).Draw(t, "a"))
	b = rapid.SliceOfN(value, m, m).Draw(t, "b")
	for j := range n {
		switch rapid.IntRange(0, 7).Draw(t, "column") {
		case 0:
			copyColumn(a, j, rapid.IntRange(0, n-1).Draw(t, "of"), 1)
		case 1:
			copyColumn(a, j, j, rapid.SampledFrom([]float64{0, 1e-12, 1e12, -2}).Draw(t, "times"))
		}
	}
	return a, b
}

func copyColumn(a *mat.Dense, to, from int, times float64) {
	m, _ := a.Dims()
	for i := range m {
		a.Set(i, to, times*a.At(i, from))
	}
}

// certain reports whether the answer is the only one and rounding errors can
// move it by no more than about 1e-9 of itself: condition number below 10⁵ with
// columns of unit norm.
func certain(a *mat.Dense) bool {
	m, n := a.Dims()
	u := mat.DenseCopyOf(a)
	for j := range n {
		norm := mat.Norm(u.ColView(j), 2)
		if norm == 0 {
			return false
		}
		copyColumn(u, j, j, 1/norm)
	}
	var svd mat.SVD
	return m >= n && svd.Factorize(u, mat.SVDNone) && svd.Cond() < 1e5
}

func solveAny(t *rapid.T, a *mat.Dense, b []float64, s *nnls.Settings) ([]float64, nnls.Result) {
	_, n := a.Dims()
	x := make([]float64, n)
	res, err := nnls.SolveTo(x, a, b, s)
	if err != nil {
		t.Fatal(err)
	}
	for j, v := range x {
		if !(v >= 0) || math.IsInf(v, 0) {
			t.Fatalf("x[%d] = %v", j, v)
		}
		if res.Passive[j] != (v > 0) {
			t.Fatalf("x[%d] = %v, passive %v", j, v, res.Passive[j])
		}
	}
	bound := passes(a, b, x)
	if v := nnls.Violation(a, b, x); !(v <= bound) || !(res.Violation <= bound) || v > 4*res.Violation+1e-12 {
		t.Fatalf("optimality violated by %g, reported %g", v, res.Violation)
	}
	return x, res
}

// eps is the unit roundoff of float64.
const eps = 1.0 / (1 << 53)

func norm(v []float64) float64 { return mat.Norm(mat.NewVecDense(len(v), v), 2) }

// terms returns ‖b‖ + Σ‖a_j‖x_j: times ε it is the rounding error of a residual.
func terms(a *mat.Dense, b, x []float64) float64 {
	sum := norm(b)
	for j, v := range x {
		sum += v * mat.Norm(a.ColView(j), 2)
	}
	return sum
}

// passes is the violation that an answer may have: 1e-10, and where the terms of
// the fit cancel, the rounding of x. A reported one is held to 1e-12 or a factor of
// four of it.
func passes(a *mat.Dense, b, x []float64) float64 {
	if norm(b) == 0 {
		return 0
	}
	return 1e-10 + 4*eps*terms(a, b, x)/norm(b)
}

// sameFit fails unless both residual norms agree to 1e-8, as a batch promises, or to
// some hundred rounding errors of terms of that size; they do even where x is not the only answer.
func sameFit(t *rapid.T, what string, size float64, got, want nnls.Result) {
	if !(math.Abs(got.Norm-want.Norm) <= 1e-8*want.Norm+1e-13*size) {
		t.Fatalf("%s: residual norm %.17g, want %.17g", what, got.Norm, want.Norm)
	}
}

// sameAnswer fails unless the terms a_j·x_j agree to 1e-9 of b or of the largest
// of them; ε times the condition number that certain allows is 1e-11.
func sameAnswer(t *rapid.T, what string, a *mat.Dense, b, x, want []float64) {
	if !certain(a) {
		return
	}
	most := norm(b)
	for j, v := range want {
		most = max(most, v*mat.Norm(a.ColView(j), 2))
	}
	for j, v := range want {
		if !(math.Abs(x[j]-v)*mat.Norm(a.ColView(j), 2) <= 1e-9*most) {
			t.Fatalf("%s: x = %v, want %v", what, x, want)
		}
	}
}

func TestProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := anyProblem(t)
		m, n := a.Dims()
		x, res := solveAny(t, a, b, nil)

		if res.Rank < 0 || res.Rank > min(m, n) || (certain(a) && res.Rank != n) {
			t.Fatalf("rank %d of a %d×%d matrix", res.Rank, m, n)
		}

		warm := &nnls.Settings{Warm: rapid.SliceOfN(rapid.Bool(), n, n).Draw(t, "warm")}
		y, got := solveAny(t, a, b, warm)
		sameFit(t, "warm start", max(terms(a, b, x), terms(a, b, y)), got, res)
		sameAnswer(t, "warm start", a, b, y, x)

		j := rapid.IntRange(0, n-1).Draw(t, "scaled")
		for _, f := range []float64{1 << 20, 0.3} {
			scaled := mat.DenseCopyOf(a)
			copyColumn(scaled, j, j, f)
			y, got = solveAny(t, scaled, b, nil)
			sameFit(t, "scaled column", max(terms(a, b, x), terms(scaled, b, y)), got, res)
			y[j] *= f
			sameAnswer(t, "scaled column", a, b, y, x)
			if f > 1 && (y[j] != x[j] || got.Norm != res.Norm) {
				t.Fatalf("column times 2²⁰: x[%d] = %v, was %v", j, y[j], x[j])
			}
		}

		order := rapid.Permutation(indicesTo(n)).Draw(t, "order")
		permuted := mat.NewDense(m, n, nil)
		for to, from := range order {
			permuted.SetCol(to, mat.Col(nil, from, a))
		}
		y, got = solveAny(t, permuted, b, nil)
		sameFit(t, "permuted", max(terms(a, b, x), terms(permuted, b, y)), got, res)
		back := make([]float64, n)
		for to, from := range order {
			back[from] = y[to]
		}
		sameAnswer(t, "permuted", a, b, back, x)

		var longer mat.Dense
		longer.Stack(a, mat.NewDense(1, n, nil))
		y, got = solveAny(t, &longer, append(append([]float64(nil), b...), 0), nil)
		sameFit(t, "row of zeros", max(terms(a, b, x), terms(a, b, y)), got, res)
		sameAnswer(t, "row of zeros", a, b, y, x)
	})
}

func indicesTo(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}

// TestBatchProperties compares a batch with the solver of one right-hand side,
// which takes another path to the answer, on samples with any gaps.
func TestBatchProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := anyProblem(t)
		m, n := a.Dims()
		s := &nnls.Settings{}
		if rapid.Bool().Draw(t, "weighted") {
			s.Weights = rapid.SliceOfN(rapid.SampledFrom([]float64{0, 0.01, 1, 1, 4, 100}), m, m).Draw(t, "weights")
			s.Weights[0] = 1
		}
		batch, err := nnls.NewBatch(a, s)
		if err != nil {
			t.Fatal(err)
		}
		samples := rapid.IntRange(1, 5).Draw(t, "samples")
		rhs := mat.NewDense(samples, m, nil)
		gone := rapid.SliceOfN(rapid.SampledFrom([]bool{false, false, false, true}), samples*m, samples*m).Draw(t, "missing")
		for i := range samples {
			rhs.SetRow(i, b)
			rhs.Set(i, i%m, b[i%m]+1)
			gone[i*m] = false // one row at least
		}
		dst := mat.NewDense(samples, n, nil)
		results, err := batch.SolveTo(dst, rhs, gone)
		if err != nil {
			t.Fatal(err)
		}
		for i, got := range results {
			w := make([]float64, m)
			for k := range w {
				if w[k] = 1; s.Weights != nil {
					w[k] = s.Weights[k]
				}
				if gone[i*m+k] {
					w[k] = 0
				}
			}
			x := make([]float64, n)
			want, err := nnls.SolveTo(x, a, rhs.RawRowView(i), &nnls.Settings{Weights: w})
			if err != nil {
				t.Fatal(err)
			}
			wa, wb := weighted(a, rhs.RawRowView(i), w)
			bound := passes(wa, wb, dst.RawRowView(i))
			if v := nnls.Violation(wa, wb, dst.RawRowView(i)); !(v <= bound) || !(got.Violation <= bound) || v > 4*got.Violation+1e-12 {
				t.Fatalf("sample %d: optimality violated by %g, reported %g", i, v, got.Violation)
			}
			if got.Rows != want.Rows {
				t.Fatalf("sample %d: %d rows, want %d", i, got.Rows, want.Rows)
			}
			sameFit(t, "batch", max(terms(wa, wb, x), terms(wa, wb, dst.RawRowView(i))), got, want)
			sameAnswer(t, "batch", wa, wb, dst.RawRowView(i), x)
		}
	})
}

// weighted returns W^½·a and W^½·b.
func weighted(a *mat.Dense, b, w []float64) (*mat.Dense, []float64) {
	wa, wb := mat.DenseCopyOf(a), append([]float64(nil), b...)
	for k, v := range w {
		h := math.Sqrt(v)
		wb[k] *= h
		for j := range wa.RawRowView(k) {
			wa.RawRowView(k)[j] *= h
		}
	}
	return wa, wb
}
