package nnls_test

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// TestBadValues: values that cannot be used are errors that say which.
func TestBadValues(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	good := []float64{1, 2, 3, 4, 5, 6}
	table := []struct {
		a, b, w []float64
		want    string
	}{
		{[]float64{1, 2, nan, 4, 5, 6}, []float64{1, 2, 3}, nil, "a[1,0] is NaN"},
		{[]float64{1, 2, 3, 4, 5, -inf}, []float64{1, 2, 3}, nil, "a[2,1] is -Inf"},
		{good, []float64{1, nan, 3}, nil, "b[1] is NaN"},
		{good, []float64{1, 2, inf}, nil, "b[2] is +Inf"},
		{good, []float64{1, 2, 3}, []float64{1, -1, 1}, "weight 1 is -1"},
		{good, []float64{1, 2, 3}, []float64{1, 1, nan}, "weight 2 is NaN"},
		{good, []float64{1, 2, 3}, []float64{inf, 1, 1}, "weight 0 is +Inf"},
		{good, []float64{1, 2, 3}, []float64{0, 0, 0}, "no rows"},
	}
	for _, c := range table {
		a, s := mat.NewDense(3, 2, c.a), &nnls.Settings{Weights: c.w}
		x := []float64{-1, -1}
		res, err := nnls.SolveTo(x, a, c.b, s)
		if err == nil || !strings.Contains(err.Error(), c.want) || res.Status != nnls.Unusable {
			t.Errorf("SolveTo: %v and error %v, want %q", res.Status, err, c.want)
		}
		if x[0] != -1 || x[1] != -1 {
			t.Errorf("%s: dst was written: %v", c.want, x)
		}
		if _, err := nnls.Covariance(a, c.b, x, s); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("Covariance: error %v, want %q", err, c.want)
		}
		if strings.HasPrefix(c.want, "b") {
			if v := nnls.Violation(a, c.b, x); !math.IsInf(v, 1) {
				t.Errorf("%s: violation %g", c.want, v)
			}
			continue
		}
		if _, err := nnls.NewBatch(a, s); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("NewBatch: error %v, want %q", err, c.want)
		}
	}
}

// TestShapes: wrong lengths are the caller's bug and panic.
func TestShapes(t *testing.T) {
	a := mat.NewDense(3, 2, []float64{1, 2, 3, 4, 5, 6})
	batch := newBatch(t, a, nil)
	v := func(n int) []float64 { return make([]float64, n) }
	d := func(r, c int) *mat.Dense { return mat.NewDense(r, c, nil) }
	for name, f := range map[string]func(){
		"dst":              func() { nnls.SolveTo(v(3), a, v(3), nil) },
		"nil dst":          func() { nnls.SolveTo(nil, a, v(3), nil) },
		"b":                func() { nnls.SolveTo(v(2), a, v(2), nil) },
		"weights":          func() { nnls.SolveTo(v(2), a, v(3), &nnls.Settings{Weights: v(2)}) },
		"warm":             func() { nnls.SolveTo(v(2), a, v(3), &nnls.Settings{Warm: make([]bool, 3)}) },
		"violation b":      func() { nnls.Violation(a, v(2), v(2)) },
		"violation x":      func() { nnls.Violation(a, v(3), v(3)) },
		"covariance":       func() { nnls.Covariance(a, v(3), v(3), nil) },
		"batch weights":    func() { nnls.NewBatch(a, &nnls.Settings{Weights: v(2)}) },
		"batch dst rows":   func() { batch.SolveTo(d(4, 2), d(5, 3), nil) },
		"batch dst cols":   func() { batch.SolveTo(d(5, 3), d(5, 3), nil) },
		"batch b":          func() { batch.SolveTo(d(5, 2), d(5, 2), nil) },
		"batch missing":    func() { batch.SolveTo(d(5, 2), d(5, 3), make([]bool, 3)) },
		"batch covariance": func() { batch.Covariance(v(2), v(2), nil) },
	} {
		func() {
			defer func() {
				if msg, ok := recover().(string); !ok || !strings.HasPrefix(msg, "nnls: ") {
					t.Errorf("%s: panic %q", name, msg)
				}
			}()
			f()
			t.Errorf("%s: no panic", name)
		}()
	}
	if m, n := batch.Dims(); m != 3 || n != 2 {
		t.Errorf("batch of %d×%d", m, n)
	}
}

// TestEmpty: no rows is an error, a matrix of zeros is not.
func TestEmpty(t *testing.T) {
	if _, err := nnls.SolveTo(nil, &mat.Dense{}, nil, nil); err == nil || !strings.Contains(err.Error(), "no rows") {
		t.Errorf("no rows: error %v", err)
	}
	if _, err := nnls.NewBatch(&mat.Dense{}, nil); err == nil || !strings.Contains(err.Error(), "no rows") {
		t.Errorf("batch without rows: error %v", err)
	}
	x := []float64{7}
	res, err := nnls.SolveTo(x, mat.NewDense(2, 1, nil), []float64{1, 2}, nil)
	if err != nil || x[0] != 0 || res.Rank != 0 || res.Status != nnls.Optimal {
		t.Errorf("zero matrix: x = %v, %+v, %v", x, res, err)
	}
	if nnls.NotRun != 0 || (nnls.Result{}).Status == nnls.Optimal {
		t.Error("the zero Status is success")
	}
}
