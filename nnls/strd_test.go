package nnls_test

import (
	"encoding/json"
	"fmt"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// TestReferenceData runs the linear regression data of NIST's Statistical
// Reference Datasets as non-negative problems and scores the answers as agreeing
// digits, LRE = min(15, −log₁₀(|c − t|/|t|)). Where the certified coefficients
// are non-negative they are the answer. Norris and Pontius have a negative
// coefficient each; turning that column round makes the certified answer the
// non-negative one. Longley is compared with the exact answer of CHK-4d.
func TestReferenceData(t *testing.T) {
	checks := loadChecks(t)
	// The least score asked of each answer. Longley, Norris' slope and
	// Wampler1–3 are asked 8, 12 and 6 in the package's specification; the
	// others stand as far below what plain Householder QR reaches as checks.json puts them.
	table := []struct {
		id     string
		turn   []int // columns turned round
		digits float64
	}{
		{"STRD-Norris", []int{0}, 11},
		{"STRD-Pontius", []int{2}, 10},
		{"STRD-NoInt1", nil, 13},
		{"STRD-NoInt2", nil, 13},
		{"STRD-Longley", []int{0, 2, 3, 4, 5}, 9},
		{"STRD-Wampler1", nil, 7},
		{"STRD-Wampler2", nil, 9},
		{"STRD-Wampler3", nil, 6},
		{"STRD-Wampler4", nil, 6},
		{"STRD-Wampler5", nil, 5},
	}
	out := &strings.Builder{}
	fmt.Fprintf(out, "%-24s %-8s %11s %9s %9s %9s %6s\n", "data", "solver", "coefficient", "std. dev.", "res. norm", "violation", "rank")
	for _, row := range table {
		c := checks[row.id]
		a, want := design(t, c), append([]float64(nil), c.Expected.Coefficients...)
		for _, j := range row.turn {
			turn(a, j)
			want[j] = -want[j]
		}
		for _, name := range []string{"SolveTo", "Batch"} {
			x, res := solvers[name](t, a, c.Inputs.Y)
			certified(t, row.id+" "+name, res)
			score := worstLRE(x, want)
			if !(score >= row.digits) {
				t.Errorf("%s %s: %.1f agreeing digits in %v, want %v", row.id, name, score, x, row.digits)
			}
			sd := "exact"
			if c.Expected.ResidualSD > 0 {
				sd = fmt.Sprintf("%.1f", deviations(t, row.id, name, a, c, x, res))
			}
			norm := worstLRE([]float64{res.Norm}, []float64{math.Sqrt(c.Expected.RSS)})
			if c.Expected.RSS > 0 && !(norm >= normDigits[name]) {
				t.Errorf("%s %s: residual norm agrees to %.1f digits", row.id, name, norm)
			}
			fmt.Fprintf(out, "%-24s %-8s %11.1f %9s %9.1f %9.1e %6d\n", row.id, name, score, sd, norm, res.Violation, res.Rank)
			if row.id == "STRD-Norris" {
				if slope := worstLRE(x[1:], want[1:]); !(slope >= 12) {
					t.Errorf("Norris slope: %.1f agreeing digits, want 12", slope)
				}
			}
		}
	}
	for _, id := range []string{"CHK-4d", "CHK-4d-nointercept"} {
		c := checks[id]
		data := checks[c.Inputs.Data]
		data.Inputs.Intercept = c.Inputs.Intercept
		a := design(t, data)
		for _, name := range []string{"SolveTo", "Batch"} {
			x, res := solvers[name](t, a, data.Inputs.Y)
			certified(t, id+" "+name, res)
			score := worstLRE(x, c.Expected.X)
			if !(score >= 8) {
				t.Errorf("%s %s: %.1f agreeing digits in %v", id, name, score, x)
			}
			if got := indices(res.Passive); !equal(got, c.Expected.Passive) {
				t.Errorf("%s %s: positive variables %v, want %v", id, name, got, c.Expected.Passive)
			}
			norm := worstLRE([]float64{res.Norm}, []float64{c.Expected.ResidualNorm})
			fmt.Fprintf(out, "%-24s %-8s %11.1f %9s %9.1f %9.1e %6d\n", id, name, score, "", norm, res.Violation, res.Rank)
		}
	}
	t.Logf("agreeing digits with the certified values\n%s", out)
}

// normDigits is asked of residual norms and what follows from them: a batch takes
// the norm from a difference of squares and promises 1e-8.
var normDigits = map[string]float64{"SolveTo": 13, "Batch": 8}

// deviations returns the score of the certified standard deviations.
func deviations(t *testing.T, id, name string, a *mat.Dense, c check, x []float64, res nnls.Result) float64 {
	t.Helper()
	spread, err := nnls.Covariance(a, c.Inputs.Y, x, nil)
	if err != nil {
		t.Fatal(err)
	}
	s := math.Sqrt(res.Variance())
	got := append([]float64(nil), spread.U...)
	for j := range got {
		got[j] *= s
	}
	score := worstLRE(got, c.Expected.StandardDeviations)
	need := min(c.Tolerance.Fields["standard_deviations"].Value, normDigits[name])
	if !(score >= need) {
		t.Errorf("%s %s: standard deviations %v agree to %.1f digits, want %v", id, name, got, score, need)
	}
	return score
}

// worstLRE returns the lowest score; where the truth is 0, −log₁₀|c|.
func worstLRE(got, want []float64) float64 {
	worst := 15.0
	for i, w := range want {
		d := math.Abs(got[i] - w)
		if w != 0 {
			d /= math.Abs(w)
		}
		if d > 0 || math.IsNaN(d) {
			worst = min(worst, -math.Log10(d))
		}
	}
	return worst
}

// design returns the matrix of the model: an intercept, then x as given, or the
// powers of the one x that the coefficients ask for.
func design(t *testing.T, c check) *mat.Dense {
	t.Helper()
	var xs [][]float64
	if json.Unmarshal(c.Inputs.X, &xs) != nil {
		xs = nil
		var one []float64
		if err := json.Unmarshal(c.Inputs.X, &one); err != nil {
			t.Fatalf("%s: %v", c.ID, err)
		}
		powers := len(c.Expected.Coefficients)
		if c.Inputs.Intercept {
			powers--
		}
		for _, x := range one {
			row := []float64{x}
			for len(row) < powers {
				row = append(row, row[len(row)-1]*x)
			}
			xs = append(xs, row)
		}
	}
	if c.Inputs.Intercept {
		for i, row := range xs {
			xs[i] = append([]float64{1}, row...)
		}
	}
	return dense(xs)
}

func turn(a *mat.Dense, j int) {
	m, _ := a.Dims()
	for i := range m {
		a.Set(i, j, -a.At(i, j))
	}
}
