package nnls

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Batch solves min ‖W^½(a·x_i − b_i)‖, x_i ≥ 0, for one matrix and many
// right-hand sides, called samples. It is safe for concurrent use.
type Batch struct {
	a *mat.Dense
	s Settings
}

// NewBatch factors the m×n matrix a, with row weights from s. It does not keep a.
// Errors and panics are those of [SolveTo].
func NewBatch(a mat.Matrix, s *Settings) (*Batch, error) {
	if s == nil {
		s = &Settings{}
	}
	m, n := a.Dims()
	checkSettings(m, n, s)
	if _, err := newProblem(a, make([]float64, m), s.Weights); err != nil {
		return nil, err
	}
	return &Batch{a: mat.DenseCopyOf(a), s: *s}, nil
}

// Dims returns the shape of the matrix.
func (p *Batch) Dims() (m, n int) { return p.a.Dims() }

// SolveTo writes the answers into dst (samples × n) for the right-hand sides in b
// (samples × m), and returns one Result a sample. A row is missing from sample i
// where b holds NaN or where missing, which may be nil, has true at i·m + row.
//
// The answer of a sample does not depend, to the last bit, on the samples beside
// it or on the number of workers. A sample that holds an infinite value or has no
// row left gets NaN and the status [Unusable]; the error then says how many and
// names the first, and all others are solved. So it is with [IterationLimit],
// where dst holds the best feasible answer. Wrong shapes panic.
func (p *Batch) SolveTo(dst, b *mat.Dense, missing []bool) ([]Result, error) {
	samples, m := b.Dims()
	am, n := p.a.Dims()
	if r, c := dst.Dims(); r != samples || c != n || m != am || (missing != nil && len(missing) != samples*m) {
		panic(fmt.Sprintf("nnls: a is %d×%d, b %d×%d, dst %d×%d, missing has length %d", am, n, samples, m, r, c, len(missing)))
	}
	results := make([]Result, samples)
	failed, first := 0, error(nil)
	for i := range results {
		err := p.solve(dst.RawRowView(i), b.RawRowView(i), missing, i, &results[i])
		if err != nil {
			if failed++; failed == 1 {
				first = fmt.Errorf("sample %d: %w", i, err)
			}
		}
	}
	if failed > 0 {
		return results, fmt.Errorf("nnls: %d of %d samples failed; %w", failed, samples, first)
	}
	return results, nil
}

func (p *Batch) solve(dst, b []float64, missing []bool, i int, res *Result) error {
	s := p.s
	s.Weights = make([]float64, len(b))
	for k := range b {
		w := 1.0
		if p.s.Weights != nil {
			w = p.s.Weights[k]
		}
		if !math.IsNaN(b[k]) && (missing == nil || !missing[i*len(b)+k]) {
			s.Weights[k] = w
		}
	}
	var err error
	if *res, err = SolveTo(dst, p.a, b, &s); res.Status == Unusable {
		for j := range dst {
			dst[j] = math.NaN()
		}
	}
	return err
}
