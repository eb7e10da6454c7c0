package nnls_test

import (
	"errors"
	"fmt"
	"math"
	"runtime"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// gapped is a survey in miniature, of a size that takes several blocks of rows,
// whose gaps are of every kind: none, shared by all, own, and so large that they
// take what a component is known by.
func gapped(samples int) (a, b *mat.Dense) {
	const m, n = 700, 6
	a, b = survey(surveyShape{samples, m, n, false})
	d := newDraw(1)
	for i := range samples {
		row := b.RawRowView(i)
		from, to := 0, 0
		switch i % 5 {
		case 1:
			from, to = 100, 180
		case 2:
			from = d.integer(0, m-1)
			to = min(m, from+d.integer(1, 100))
		case 3:
			from, to = 5, m-5-d.integer(0, 3) // fourteen rows or so stay
		case 4:
			from, to = m-d.integer(690, 697), m // fewer rows than columns, or little more
		}
		for k := from; k < to; k++ {
			row[k] = math.NaN()
		}
	}
	return a, b
}

func newBatch(t testing.TB, a mat.Matrix, s *nnls.Settings) *nnls.Batch {
	t.Helper()
	batch, err := nnls.NewBatch(a, s)
	if err != nil {
		t.Fatal(err)
	}
	return batch
}

// TestBatchGaps compares every sample with the solver of one right-hand side.
func TestBatchGaps(t *testing.T) {
	const samples = 200
	a, b := gapped(samples)
	m, n := a.Dims()
	x := mat.NewDense(samples, n, nil)
	results, err := newBatch(t, a, nil).SolveTo(x, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	worst := [5]float64{}
	for i, res := range results {
		var pa, pb []float64
		for k, v := range b.RawRowView(i) {
			if !math.IsNaN(v) {
				pa = append(pa, a.RawRowView(k)...)
				pb = append(pb, v)
			}
		}
		present := mat.NewDense(len(pb), n, pa)
		want := make([]float64, n)
		one, err := nnls.SolveTo(want, present, pb, nil)
		if err != nil {
			t.Fatal(err)
		}
		if res.Rows != len(pb) || res.Rank != one.Rank || m == len(pb) != (i%5 == 0) {
			t.Errorf("sample %d: %d rows and rank %d, want %d and %d", i, res.Rows, res.Rank, len(pb), one.Rank)
		}
		if v := nnls.Violation(present, pb, x.RawRowView(i)); !(v <= 1e-10) || !(res.Violation <= 1e-10) {
			t.Errorf("sample %d: optimality violated by %g, reported %g", i, v, res.Violation)
		}
		near(t, fmt.Sprintf("sample %d norm", i), []float64{res.Norm}, []float64{one.Norm}, 1e-8, 0)
		for j, v := range want {
			worst[i%5] = max(worst[i%5], math.Abs(x.At(i, j)-v)/mat.Max(mat.NewVecDense(n, want)))
		}
	}
	for kind, v := range worst {
		// The answer to 1e-9; the last kind has fewer rows than columns, so
		// that fits agree but answers need not.
		if kind < 4 && !(v <= 1e-9) {
			t.Errorf("kind %d: answers differ by %g", kind, v)
		}
	}
	t.Logf("largest difference from one by one, by kind of gap: %.1e", worst)
}

// TestGapTakesInformation hides the rows of a component, which shows in the others
// by 10^−e of its height only, and makes so much of it that it can still be told.
// The small problem of H alone would be wrong by 10^(2e−16).
func TestGapTakesInformation(t *testing.T) {
	const m = 400
	for e := 1; e <= 9; e++ {
		d := newDraw(e)
		a := mat.NewDense(m, 3, nil)
		b := mat.NewDense(2, m, nil) // exact, and with noise
		truth := []float64{2, math.Pow10(e), 1}
		w := make([]float64, m)
		for k := range m {
			a.SetRow(k, []float64{d.unit(), math.Pow10(-e) * d.unit(), d.unit()})
			if w[k] = 1; k >= 100 && k < 150 {
				a.Set(k, 1, 1+d.unit())
				w[k] = 0
			}
			for j, v := range a.RawRowView(k) {
				b.Set(0, k, b.At(0, k)+v*truth[j])
			}
			b.Set(1, k, b.At(0, k)+3*d.sym())
			if w[k] == 0 {
				b.Set(0, k, math.NaN())
				b.Set(1, k, math.NaN())
			}
		}
		x, want := mat.NewDense(2, 3, nil), make([]float64, 3)
		res, err := newBatch(t, a, nil).SolveTo(x, b, nil)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := nnls.SolveTo(want, a, b.RawRowView(1), &nnls.Settings{Weights: w}); err != nil {
			t.Fatal(err)
		}
		near(t, fmt.Sprintf("10^-%d", e), x.RawRowView(0), truth, 1e-12, 0)
		near(t, fmt.Sprintf("10^-%d with noise", e), x.RawRowView(1), want, 1e-12, 0)
		certified(t, fmt.Sprintf("10^-%d", e), res[0])
		certified(t, fmt.Sprintf("10^-%d with noise", e), res[1])
	}
}

// TestBatchSameBytes runs samples with other numbers of workers, other
// neighbours and alone.
func TestBatchSameBytes(t *testing.T) {
	const samples = 150
	a, b := gapped(samples)
	_, n := a.Dims()
	solve := func(workers int, rhs *mat.Dense) (*mat.Dense, []nnls.Result) {
		rows, _ := rhs.Dims()
		x := mat.NewDense(rows, n, nil)
		res, err := newBatch(t, a, &nnls.Settings{Workers: workers}).SolveTo(x, rhs, nil)
		if err != nil {
			t.Fatal(err)
		}
		return x, res
	}
	want, results := solve(1, b)
	for _, workers := range []int{0, 2, 3, 16} {
		got, res := solve(workers, b)
		for i := range samples {
			sameBytes(t, fmt.Sprintf("%d workers, sample %d", workers, i), got.RawRowView(i), want.RawRowView(i), res[i], results[i])
		}
	}
	backwards := mat.NewDense(samples, 700, nil)
	for i := range samples {
		backwards.SetRow(samples-1-i, b.RawRowView(i))
		alone, res := solve(1, mat.NewDense(1, 700, b.RawRowView(i)))
		sameBytes(t, fmt.Sprintf("sample %d alone", i), alone.RawRowView(0), want.RawRowView(i), res[0], results[i])
	}
	got, res := solve(2, backwards)
	for i := range samples {
		sameBytes(t, fmt.Sprintf("backwards, sample %d", i), got.RawRowView(samples-1-i), want.RawRowView(i), res[samples-1-i], results[i])
	}
}

func sameBytes(t *testing.T, what string, got, want []float64, gotRes, wantRes nnls.Result) {
	t.Helper()
	if g, w := fmt.Sprintf("%x %+v", got, gotRes), fmt.Sprintf("%x %+v", want, wantRes); g != w {
		t.Errorf("%s:\n%s, want\n%s", what, g, w)
	}
}

// TestBatchCanaries puts values that must not be read where rows are missing or
// of weight 0.
func TestBatchCanaries(t *testing.T) {
	a, b := survey(surveyShape{20, 300, 4, false})
	weights, missing := make([]float64, 300), make([]bool, 20*300)
	d := newDraw(3)
	for k := range weights {
		weights[k] = 0.5 + d.unit()
	}
	for _, k := range []int{0, 7, 299} {
		weights[k] = 0
	}
	for i := range missing {
		missing[i] = d.unit() < 0.05
	}
	batch := newBatch(t, a, &nnls.Settings{Weights: weights})
	var want [2]*mat.Dense
	for pass := range want {
		want[pass] = mat.NewDense(20, 4, nil)
		res, err := batch.SolveTo(want[pass], b, missing)
		if err != nil {
			t.Fatal(err)
		}
		for i, r := range res {
			certified(t, fmt.Sprintf("sample %d", i), r)
		}
		for i := range missing { // for the second pass
			if missing[i] || weights[i%300] == 0 {
				b.Set(i/300, i%300, []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e300}[i%4])
			}
		}
		for j := range 4 {
			a.Set(7, j, math.NaN()) // a row of weight 0
		}
		batch = newBatch(t, a, &nnls.Settings{Weights: weights})
	}
	if !mat.Equal(want[0], want[1]) {
		t.Errorf("values of missing rows reached the answer")
	}
}

// TestBatchBadSamples: one bad sample stops neither the others nor their bytes.
func TestBatchBadSamples(t *testing.T) {
	a, b := survey(surveyShape{9, 300, 4, false})
	batch := newBatch(t, a, nil)
	want := mat.NewDense(9, 4, nil)
	if _, err := batch.SolveTo(want, b, nil); err != nil {
		t.Fatal(err)
	}
	b.Set(2, 17, math.Inf(-1))
	for k := range 300 {
		b.Set(5, k, math.NaN())
	}
	got := mat.NewDense(9, 4, nil)
	results, err := batch.SolveTo(got, b, nil)
	if err == nil || !strings.Contains(err.Error(), "2 of 9 samples failed; sample 2: b[17] is -Inf") {
		t.Errorf("error %v", err)
	}
	for i, res := range results {
		bad := i == 2 || i == 5
		if (res.Status == nnls.Unusable) != bad {
			t.Errorf("sample %d: %v", i, res.Status)
		}
		for j, v := range got.RawRowView(i) {
			if bad && !math.IsNaN(v) || !bad && v != want.At(i, j) {
				t.Errorf("sample %d: %v, without the bad samples %v", i, got.RawRowView(i), want.RawRowView(i))
			}
		}
	}
}

// TestExtremes scales the data to the ends of float64: by powers of two, so that
// the digits must be the same.
func TestExtremes(t *testing.T) {
	a, b := gapped(10)
	_, n := a.Dims()
	batch := newBatch(t, a, nil)
	want := mat.NewDense(10, n, nil)
	wantRes, err := batch.SolveTo(want, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range []int{-1000, -600, 600, 1000} {
		var scaled mat.Dense
		scaled.Scale(math.Ldexp(1, e), b)
		got := mat.NewDense(10, n, nil)
		res, err := batch.SolveTo(got, &scaled, nil)
		if err != nil {
			t.Fatal(err)
		}
		got.Scale(math.Ldexp(1, -e), got)
		for i := range 10 {
			near(t, fmt.Sprintf("2^%d sample %d", e, i), got.RawRowView(i), want.RawRowView(i), 1e-12, 0)
			near(t, fmt.Sprintf("2^%d norm %d", e, i), []float64{math.Ldexp(res[i].Norm, -e)}, []float64{wantRes[i].Norm}, 1e-8, 0)
			certified(t, fmt.Sprintf("2^%d sample %d", e, i), res[i])
		}
		for _, f := range []int{-1000, 1000} {
			var tall mat.Dense
			tall.Scale(math.Ldexp(1, f), a)
			x := make([]float64, n)
			_, err := nnls.SolveTo(x, &tall, scaled.RawRowView(0), nil)
			switch {
			case e-f > 1020 && err == nil:
				t.Errorf("2^%d over 2^%d: no error for %v", e, f, x)
			case e-f <= 1000 && e-f >= -1000 && err != nil:
				t.Errorf("2^%d over 2^%d: %v", e, f, err)
			case err == nil && e-f >= -1000:
				for j := range x {
					x[j] = math.Ldexp(x[j], f-e)
				}
				near(t, fmt.Sprintf("2^%d over 2^%d", e, f), x, want.RawRowView(0), 1e-9, 0)
			}
		}
	}
}

// TestIterationLimit wants the best feasible answer and the error.
func TestIterationLimit(t *testing.T) {
	a, b := survey(surveyShape{3, 300, 6, false})
	full := make([]float64, 6)
	best, err := nnls.SolveTo(full, a, b.RawRowView(0), nil)
	if err != nil {
		t.Fatal(err)
	}
	last := math.Inf(1)
	for limit := 1; limit < best.Iterations; limit++ {
		x := make([]float64, 6)
		res, err := nnls.SolveTo(x, a, b.RawRowView(0), &nnls.Settings{MaxIter: limit})
		if !errors.Is(err, nnls.ErrIterationLimit) || res.Status != nnls.IterationLimit {
			t.Fatalf("limit %d: %v, %v", limit, res.Status, err)
		}
		if !(res.Norm < last) || !(res.Norm >= best.Norm) || mat.Min(mat.NewVecDense(6, x)) < 0 {
			t.Errorf("limit %d: norm %g of %v, before %g, best %g", limit, res.Norm, x, last, best.Norm)
		}
		if res.Violation <= 1e-10 {
			t.Errorf("limit %d: violation %g of an answer that is not optimal", limit, res.Violation)
		}
		last = res.Norm
	}
	if math.IsInf(last, 1) {
		t.Errorf("%d iterations: the example is too easy", best.Iterations)
	}
}

// TestCancellingTerms has an answer whose terms are 10⁶ times b and cancel; a random
// search found it. Without refinement it is wrong in the fourteenth digit, which is
// an optimality violated by 1e-10.
func TestCancellingTerms(t *testing.T) {
	a := mat.NewDense(4, 9, []float64{
		1, 1, 1, 0, 1, 1, -1, 1, 1,
		-1, 1, 1, 0, 1, 1, 0.5, 1, 1,
		1.52587890625e-05, 1, 1, 0, 1, 1, 3.814697265625e-06, 1, -1,
		1.52587890625e-05, 1, 1, 0, 1, 1, 7.62939453125e-06, 1, -1,
	})
	want := []float64{1376256, 229363, 0, 0, 0, 0, 1835008, 0, 229390}
	for name, solve := range solvers {
		x, res := solve(t, a, []float64{1, 1, 1, 8})
		certified(t, name, res)
		if x[1] == 0 { // one of four equal columns
			t.Fatalf("%s: x = %v", name, x)
		}
		// SolveTo sums residuals in twice the precision, a batch does not.
		near(t, name, x, want, map[string]float64{"SolveTo": 1e-15, "Batch": 1e-11}[name], 0)
	}
}

// TestHiddenVariable has a variable whose dual the digits lost with the gap hide: the
// answer without it is violated by 5e-11 only, and yet a ten-thousandth worse. A
// random search found it.
func TestHiddenVariable(t *testing.T) {
	a := mat.NewDense(5, 4, []float64{
		-9.313225746154785e-10, 1, 1, 4.5,
		-4, 1, 1, 1,
		5.960464477539063e-08, 1, 0.0625, 1,
		5.820766091346741e-11, 0.5, -0.5, -1,
		1, 1, 1, 30.5,
	})
	b := []float64{1.1641532182693481e-10, -1, 1.862645149230957e-09, 1.8189894035458565e-12, math.NaN()}
	x := mat.NewDense(1, 4, nil)
	res, err := newBatch(t, a, &nnls.Settings{Weights: []float64{1, .01, .01, 1, 1}}).SolveTo(x, mat.NewDense(1, 5, b), nil)
	if err != nil {
		t.Fatal(err)
	}
	want := make([]float64, 4)
	one, err := nnls.SolveTo(want, a, b, &nnls.Settings{Weights: []float64{1, .01, .01, 1, 0}})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "norm", []float64{res[0].Norm}, []float64{one.Norm}, 1e-8, 0)
	// Two of the terms are 1e-10 of b: one rounding is 1e-6 of them.
	near(t, "x", x.RawRowView(0), want, 1e-4, 0)
	if !(res[0].Violation <= 1e-13) {
		t.Errorf("optimality violated by %g", res[0].Violation)
	}
}

// TestRank counts columns that others make up.
func TestRank(t *testing.T) {
	a := mat.NewDense(5, 4, []float64{
		1, 2, 3, 0,
		0, 1, 1, 0,
		2, 0, 2, 0,
		1, 1, 2, 0,
		3, 1, 4, 0,
	}) // the third is the sum of the first two, the fourth zero
	for name, solve := range solvers {
		x, res := solve(t, a, []float64{3, 1, 2, 2, 4})
		if res.Rank != 2 {
			t.Errorf("%s: rank %d, want 2; x = %v", name, res.Rank, x)
		}
		certified(t, name, res)
		if !(res.Norm <= 1e-14) {
			t.Errorf("%s: residual norm %g of an exact fit", name, res.Norm)
		}
	}
}

// TestBatchMemory holds the memory of a call to the promise in its comment.
func TestBatchMemory(t *testing.T) {
	const m, n = 200, 3
	a, b := survey(surveyShape{20000, m, n, true})
	batch := newBatch(t, a, &nnls.Settings{Workers: 2})
	x := mat.NewDense(20000, n, nil)
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	if _, err := batch.SolveTo(x, b, nil); err != nil {
		t.Fatal(err)
	}
	runtime.ReadMemStats(&after)
	// What the garbage collector reclaims counts here as well: results of 96
	// bytes and an error each, masks and lists of samples with the same mask.
	perSample := float64(after.TotalAlloc-before.TotalAlloc) / 20000
	t.Logf("%.0f bytes a sample, %d of data", perSample, 8*m)
	if perSample > 500 {
		t.Errorf("%.0f bytes a sample", perSample)
	}
}
