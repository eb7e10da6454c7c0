package nnls_test

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// check is one entry of testdata/nnls/checks.json: published worked examples
// and reference data, each with its source and tolerance. Numbers marked
// computed were derived in exact rational arithmetic over all passive sets.
type check struct {
	ID     string
	Inputs struct {
		A, S      [][]float64
		B, Y      []float64
		X         json.RawMessage // one row or one value an observation
		Data      string
		Intercept bool
		Model     string
	}
	Expected struct {
		X, W, Residual, Coefficients []float64
		Unconstrained                []float64
		StandardDeviations           []float64 `json:"standard_deviations"`
		ResidualSD                   float64   `json:"residual_sd"`
		RSS                          float64   `json:"residual_sum_squares"`
		ResidualNorm                 float64   `json:"residual_norm"`
		UnconstrainedNorm            float64   `json:"unconstrained_residual_norm"`
		Passive                      []int     `json:"passive_set_0based"`
		UOverSigma                   []float64 `json:"u_over_sigma"`
	}
	Tolerance struct {
		Value  float64
		Zero   float64 `json:"absolute_for_zero"`
		Fields map[string]struct {
			Kind  string
			Value float64
		}
	}
}

func loadChecks(t *testing.T) map[string]check {
	t.Helper()
	raw, err := os.ReadFile("../testdata/nnls/checks.json")
	if err != nil {
		t.Fatal(err)
	}
	var list []check
	if err := json.Unmarshal(raw, &list); err != nil {
		t.Fatal(err)
	}
	byID := make(map[string]check)
	for _, c := range list {
		byID[c.ID] = c
	}
	return byID
}

func dense(rows [][]float64) *mat.Dense {
	out := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, r := range rows {
		out.SetRow(i, r)
	}
	return out
}

// TestWorkedExamples has the published examples of small problems.
func TestWorkedExamples(t *testing.T) {
	checks := loadChecks(t)
	for _, id := range []string{"CHK-4a", "CHK-4a-misprint", "CHK-4b", "CHK-4c", "CHK-4f"} {
		t.Run(id, func(t *testing.T) {
			c := checks[id]
			a := dense(c.Inputs.A)
			for name, solve := range solvers {
				x, res := solve(t, a, c.Inputs.B)
				near(t, name+" x", x, c.Expected.X, c.Tolerance.Value, 0)
				r, w := dual(a, c.Inputs.B, x)
				near(t, name+" w", w, c.Expected.W, c.Tolerance.Value, max(c.Tolerance.Zero, 2e-13))
				if c.Expected.Residual != nil {
					near(t, name+" residual", r, c.Expected.Residual, c.Tolerance.Value, 0)
				}
				near(t, name+" norm", []float64{res.Norm}, []float64{c.Expected.ResidualNorm}, c.Tolerance.Value, 0)
				certified(t, name, res)
				if got, want := indices(res.Passive), positive(c.Expected.X); !equal(got, want) {
					t.Errorf("%s: positive variables %v, want %v", name, got, want)
				}
			}
		})
	}
}

// TestUnconstrained frees the variables whose least-squares answer would be
// negative by turning their columns round: min ‖a·D·y − b‖ with D = diag(±1)
// then has the unconstrained answer x = D·y.
func TestUnconstrained(t *testing.T) {
	checks := loadChecks(t)
	for _, id := range []string{"CHK-4a", "CHK-4b", "CHK-4c"} {
		c := checks[id]
		a := dense(c.Inputs.A)
		want := append([]float64(nil), c.Expected.Unconstrained...)
		for j, v := range want {
			if v < 0 {
				turn(a, j)
				want[j] = -v
			}
		}
		for name, solve := range solvers {
			x, res := solve(t, a, c.Inputs.B)
			near(t, id+" "+name, x, want, c.Tolerance.Value, 0)
			if c.Expected.UnconstrainedNorm > 0 {
				near(t, id+" "+name+" norm", []float64{res.Norm}, []float64{c.Expected.UnconstrainedNorm}, c.Tolerance.Value, 0)
			}
		}
	}
}

// TestOverlappingSpectra checks the standard uncertainties of CHK-4e, and
// through them the Gram matrix, cosine and variance inflation they follow from.
func TestOverlappingSpectra(t *testing.T) {
	c := loadChecks(t)["CHK-4e"]
	a := dense(c.Inputs.S)
	x := []float64{2, 3}
	b := product(a, x)
	spread, err := nnls.Covariance(a, b, x, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "u/σ", spread.U, c.Expected.UOverSigma, c.Tolerance.Value, 0)
	near(t, "x", spread.Free, x, c.Tolerance.Value, 0)
}

// A solver finds x for one right-hand side.
type solver func(t *testing.T, a *mat.Dense, b []float64) ([]float64, nnls.Result)

// solvers face the same tests.
var solvers = map[string]solver{"SolveTo": solveOne, "Batch": solveBatch}

func solveOne(t *testing.T, a *mat.Dense, b []float64) ([]float64, nnls.Result) {
	t.Helper()
	_, n := a.Dims()
	x := make([]float64, n)
	res, err := nnls.SolveTo(x, a, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	return x, res
}

func solveBatch(t *testing.T, a *mat.Dense, b []float64) ([]float64, nnls.Result) {
	t.Helper()
	_, n := a.Dims()
	batch, err := nnls.NewBatch(a, nil)
	if err != nil {
		t.Fatal(err)
	}
	x := mat.NewDense(1, n, nil)
	res, err := batch.SolveTo(x, mat.NewDense(1, len(b), append([]float64(nil), b...)), nil)
	if err != nil {
		t.Fatal(err)
	}
	return x.RawRowView(0), res[0]
}

// certified fails unless the certificate passes as METHODS 4.1 asks, 1e-10.
func certified(t *testing.T, name string, res nnls.Result) {
	t.Helper()
	if res.Status != nnls.Optimal || !(res.Violation <= 1e-10) {
		t.Errorf("%s: %v, optimality violated by %g", name, res.Status, res.Violation)
	}
}

// near fails unless |got − want| ≤ rel·|want|; where want is 0, ≤ zero.
func near(t *testing.T, name string, got, want []float64, rel, zero float64) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%s: %v, want %v", name, got, want)
	}
	for i, w := range want {
		tol := rel * math.Abs(w)
		if w == 0 {
			tol = zero
		}
		if !(math.Abs(got[i]-w) <= tol) {
			t.Errorf("%s[%d] = %.15g, want %.15g within %.2g", name, i, got[i], w, tol)
		}
	}
}

// dual returns r = b − a·x and w = aᵀ·r.
func dual(a *mat.Dense, b, x []float64) (r, w []float64) {
	var rv, wv mat.VecDense
	rv.MulVec(a, mat.NewVecDense(len(x), x))
	rv.SubVec(mat.NewVecDense(len(b), b), &rv)
	wv.MulVec(a.T(), &rv)
	return rv.RawVector().Data, wv.RawVector().Data
}

func product(a *mat.Dense, x []float64) []float64 {
	var v mat.VecDense
	v.MulVec(a, mat.NewVecDense(len(x), x))
	return v.RawVector().Data
}

func indices(set []bool) []int {
	var out []int
	for j, in := range set {
		if in {
			out = append(out, j)
		}
	}
	return out
}

func positive(x []float64) []int {
	var out []int
	for j, v := range x {
		if v > 0 {
			out = append(out, j)
		}
	}
	return out
}

func equal(a, b []int) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}
