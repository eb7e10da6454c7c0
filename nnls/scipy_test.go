package nnls_test

import (
	"bufio"
	"fmt"
	"math"
	"math/big"
	"os"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// draw is the generator of testdata/nnls/scipy_objectives.py. Products are
// rounded by conversion so that no platform fuses them with a sum.
type draw struct{ s uint64 }

func newDraw(seed int) *draw {
	d := &draw{uint64(seed)*2654435761 + 12345}
	for range 4 {
		d.unit()
	}
	return d
}

func (d *draw) unit() float64 {
	d.s = d.s*6364136223846793005 + 1442695040888963407
	return float64(d.s>>11) / (1 << 53)
}

func (d *draw) sym() float64 { return 2*d.unit() - 1 }

func (d *draw) integer(lo, hi int) int { return lo + int(d.unit()*float64(hi-lo+1)) }

// scipyProblem is problem(i) of testdata/nnls/scipy_objectives.py.
func scipyProblem(i int) (a *mat.Dense, b []float64) {
	d := newDraw(i)
	kind, variant := i%10, i/10
	n := d.integer(2, 12)
	m := d.integer(n+1, 60)
	if kind == 1 || ((kind == 4 || kind == 5) && variant%2 == 1) {
		m = d.integer(2, 12)
		n = d.integer(m+1, 40)
	}
	rows := make([][]float64, m)
	for k := range rows {
		rows[k] = make([]float64, n)
		for j := range rows[k] {
			rows[k][j] = d.sym()
		}
	}
	b = make([]float64, m)
	for k := range b {
		b[k] = d.sym()
	}
	switch kind {
	case 2:
		delta := math.Pow10(-(variant%7 + 1))
		for _, row := range rows {
			for j := 1; j < n; j++ {
				row[j] = row[0] + float64(delta*row[j])
			}
		}
	case 3:
		for _, row := range rows {
			for j := range row {
				row[j] = math.Trunc(row[j]*1024) / 1024
			}
			for j := (n + 1) / 2; j < n; j++ {
				if row[j] = row[0] + row[1]; j%2 == 1 {
					row[j] = 2 * row[0]
				}
			}
		}
	case 4:
		for j := range n {
			if d.unit() < 1.0/3 {
				scaleColumn(rows, j, 0)
			}
		}
	case 5:
		clear(b)
	case 6:
		for j := range n {
			scaleColumn(rows, j, math.Pow10(d.integer(-12, 12)))
		}
		scaleAll(b, math.Pow10(d.integer(-12, 12)))
	case 7, 8, 9:
		mixture(d, kind, rows, b)
	}
	return dense(rows), b
}

func mixture(d *draw, kind int, rows [][]float64, b []float64) {
	x := make([]float64, len(rows[0]))
	for _, row := range rows {
		for j := range row {
			row[j] = math.Abs(row[j])
		}
	}
	for j := range x {
		x[j] = max(0, d.sym())
	}
	noise := 0.01
	if kind == 8 {
		noise = 0
	}
	for k, row := range rows {
		v := noise * b[k]
		for j := range row {
			v += float64(row[j] * x[j])
		}
		b[k] = v
	}
	if kind == 9 {
		f, g := math.Pow10(d.integer(-12, 12)), math.Pow10(d.integer(-12, 12))
		for _, row := range rows {
			scaleAll(row, f)
		}
		scaleAll(b, g)
	}
}

func scaleColumn(rows [][]float64, j int, f float64) {
	for _, row := range rows {
		row[j] *= f
	}
}

func scaleAll(v []float64, f float64) {
	for i := range v {
		v[i] *= f
	}
}

// scipyObjectives returns the stored objectives; NaN where SciPy gave up.
func scipyObjectives(t *testing.T) []float64 {
	t.Helper()
	f, err := os.Open("../testdata/nnls/scipy_objectives.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var out []float64
	for lines := bufio.NewScanner(f); lines.Scan(); {
		i, v, ok := strings.Cut(lines.Text(), ",")
		if at, err := strconv.Atoi(i); !ok || err != nil || at != len(out) {
			continue // comments and header
		}
		value, err := strconv.ParseFloat(v, 64)
		if err != nil {
			value = math.NaN()
		}
		out = append(out, value)
	}
	return out
}

// objective returns ‖b − a·x‖ and the rounding error that an x in float64 cannot
// avoid, ε·‖|b| + |a|·|x|‖, evaluated with 200 bits.
func objective(a *mat.Dense, b, x []float64) (norm, rounding float64) {
	sum, terms := newBig(), 0.0
	for i, v := range b {
		r, size := newBig().SetFloat64(v), math.Abs(v)
		for j, aij := range a.RawRowView(i) {
			p := newBig().SetFloat64(aij)
			r.Sub(r, p.Mul(p, newBig().SetFloat64(x[j])))
			size += math.Abs(aij * x[j])
		}
		sum.Add(sum, r.Mul(r, r))
		terms = math.Hypot(terms, size)
	}
	norm, _ = sum.Sqrt(sum).Float64()
	return norm, terms / (1 << 53)
}

func newBig() *big.Float { return new(big.Float).SetPrec(200) }

// TestAgainstSciPy compares objectives with those of an independent program: ours
// may be larger by 1e-10 of theirs at most. Where the least norm is zero, both are
// rounding errors: then ours may be four times what the rounding of x alone gives.
func TestAgainstSciPy(t *testing.T) {
	want := scipyObjectives(t)
	if len(want) != 2000 {
		t.Fatalf("%d stored objectives, want 2000", len(want))
	}
	for _, name := range []string{"SolveTo", "Batch"} {
		same, lower, zero, worst := 0, 0, 0, 0.0
		for i, theirs := range want {
			a, b := scipyProblem(i)
			x, res := solvers[name](t, a, b)
			certified(t, fmt.Sprintf("%s, problem %d", name, i), res)
			worst = max(worst, res.Violation)
			ours, rounding := objective(a, b, x)
			switch {
			case math.Abs(ours-theirs) <= 1e-10*theirs:
				same++
			case ours <= 4*rounding:
				zero++
			case ours < theirs:
				lower++
			default: // also where SciPy gave up, so that a reader sees it
				t.Errorf("%s, problem %d of kind %d: objective %.17g, SciPy %.17g, rounding %g", name, i, i%10, ours, theirs, rounding)
			}
		}
		t.Logf("%s: %d equal to 1e-10, %d lower, %d zero to rounding; largest violation %.1e", name, same, lower, zero, worst)
		if same < 1500 {
			t.Errorf("%s: only %d comparisons count", name, same)
		}
	}
}
