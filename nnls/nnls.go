package nnls

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Status says why a solver stopped. The zero value is not success.
type Status int

const (
	NotRun         Status = iota
	Optimal               // the active set holds no variable that could still lower the norm
	IterationLimit        // Settings.MaxIter reached; the answer is feasible, not optimal
	Unusable              // a right-hand side that is not finite, or that has no row left
)

func (s Status) String() string {
	switch s {
	case NotRun:
		return "not run"
	case Optimal:
		return "optimal"
	case IterationLimit:
		return "iteration limit"
	case Unusable:
		return "unusable"
	}
	return fmt.Sprintf("Status(%d)", int(s))
}

// ErrIterationLimit is returned, wrapped, beside the best feasible answer.
var ErrIterationLimit = errors.New("nnls: iteration limit reached")

// Settings of a solver. The zero value works, and so does a nil pointer.
type Settings struct {
	// Weights has one value ≥ 0 a row, 1/σ² of the row; nil means 1 each.
	// A row of weight 0 is not read, so it may hold NaN.
	Weights []float64

	// Warm marks the variables expected to be positive, one a column. A good
	// guess saves iterations and never changes the answer; nil means none.
	Warm []bool

	// MaxIter limits the number of times a variable becomes positive or zero.
	// Zero means 30 + 10·n.
	MaxIter int

	// Workers is the number of goroutines of a Batch. It does not change a
	// bit of the answer. Zero means GOMAXPROCS.
	Workers int
}

// Result says how an answer was found and how good it is.
type Result struct {
	Status     Status
	Iterations int     // variables that became positive or zero on the way
	Norm       float64 // ‖W^½(a·x − b)‖
	Violation  float64 // of the optimality conditions, scale-free; see [Violation]
	Rank       int     // numerical rank of W^½·a; below n the answer need not be the only one
	Rows       int     // rows used: neither of weight 0 nor missing
	Passive    []bool  // one a column: the variable is free, that is positive
}

// Positive returns the number of positive variables.
func (r Result) Positive() int {
	k := 0
	for _, p := range r.Passive {
		if p {
			k++
		}
	}
	return k
}

// Variance returns s² = Norm²/(Rows − Positive), the variance of one row of
// weight 1 as the residual shows it; NaN where no degree of freedom is left.
// Where the weights are trusted as 1/σ², s² should be near 1.
func (r Result) Variance() float64 {
	df := r.Rows - r.Positive()
	if df <= 0 {
		return math.NaN()
	}
	return r.Norm * r.Norm / float64(df)
}

// SolveTo writes the x ≥ 0 that minimises ‖W^½(a·x − b)‖ into dst. The matrix a
// is m×n, b has m values and dst n. Inputs are not changed.
//
// Values that are not finite, a negative weight, or an a of which no row is left
// are errors and leave dst as it was. At the iteration limit dst holds the best
// feasible answer and the error wraps [ErrIterationLimit]. Wrong lengths panic.
func SolveTo(dst []float64, a mat.Matrix, b []float64, s *Settings) (Result, error) {
	if s == nil {
		s = &Settings{}
	}
	m, n := a.Dims()
	checkShapes(m, n, len(dst), len(b), s)
	p, err := newProblem(a, b, s.Weights)
	if err != nil {
		return Result{Status: Unusable}, err
	}
	t, c := p.reduce()
	act := newActive(t.k, n)
	act.load(&t, c, p.normB)
	act.warm(s.Warm)
	res := Result{Rank: t.k, Rows: p.m}
	res.Status = act.run(s.limit(n))
	res.Iterations = act.iterations
	res.Passive = act.free
	norm, v := p.refine(act)
	res.Norm, res.Violation = math.Ldexp(norm, p.eb+p.ew), v
	p.unscaleTo(dst, act.x)
	for j, v := range dst {
		if math.IsInf(v, 0) {
			return Result{Status: Unusable}, fmt.Errorf("nnls: variable %d of the answer exceeds the range of float64; scale a or b", j)
		}
	}
	if res.Status == IterationLimit {
		return res, fmt.Errorf("%w after %d changes", ErrIterationLimit, res.Iterations)
	}
	return res, nil
}

func (s *Settings) limit(n int) int {
	if s.MaxIter > 0 {
		return s.MaxIter
	}
	return 30 + 10*n
}

func checkShapes(m, n, dst, b int, s *Settings) {
	switch {
	case dst != n:
		panic(fmt.Sprintf("nnls: dst has length %d, want one a column: %d", dst, n))
	case b != m:
		panic(fmt.Sprintf("nnls: b has length %d, want one a row: %d", b, m))
	}
	checkSettings(m, n, s)
}

func checkSettings(m, n int, s *Settings) {
	if s.Weights != nil && len(s.Weights) != m {
		panic(fmt.Sprintf("nnls: %d weights, want one a row: %d", len(s.Weights), m))
	}
	if s.Warm != nil && len(s.Warm) != n {
		panic(fmt.Sprintf("nnls: Warm has length %d, want one a column: %d", len(s.Warm), n))
	}
}
