package merit

import (
	"math"
	"math/bits"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// nearest finds the x ≥ 0 that minimises (x − z)'G(x − z), for many z and one G of a
// handful of components. Sets of components above zero come back again and again, so
// that their inverses are kept: a draw costs two small products, a hundredth of a
// problem solved by itself.
type nearest struct {
	n    int
	gram []float64
	inv  map[uint64][]float64 // of the Gram matrix on a set of components; nil where singular
	last uint64
	kept []float64 // inv[last]
	rhs  []float64
}

func newNearest(gram []float64, n int) *nearest {
	return &nearest{n: n, gram: gram, inv: map[uint64][]float64{}, rhs: make([]float64, n)}
}

// solve replaces z by that x. It changes the set by every component that is on the
// wrong side (block principal pivoting: Júdice & Pires 1994, Comput. Oper. Res. 21,
// 587; from memory) and says false where that does not end, or a set is singular.
func (s *nearest) solve(z []float64) bool {
	var set uint64
	for f := range s.n {
		s.rhs[f] = 0
		for h, v := range z {
			s.rhs[f] += s.gram[f*s.n+h] * v
		}
		if z[f] > 0 {
			set |= 1 << f
		}
	}
	var x [64]float64
	for range 4 * s.n {
		inv := s.inverse(set)
		if inv == nil {
			return false
		}
		var wrong uint64
		for f := range s.n {
			x[f] = 0
			if set>>f&1 == 1 {
				for h, v := range s.rhs {
					x[f] += inv[f*s.n+h] * v
				}
				if x[f] < 0 {
					wrong |= 1 << f
				}
			}
		}
		for f := range s.n {
			if set>>f&1 == 1 {
				continue
			}
			dual, size := s.rhs[f], math.Abs(s.rhs[f])
			for h := range s.n {
				v := s.gram[f*s.n+h] * x[h]
				dual, size = dual-v, size+math.Abs(v)
			}
			if dual > 1e-13*size { // rounding of the sum
				wrong |= 1 << f
			}
		}
		if wrong == 0 {
			copy(z, x[:s.n])
			return true
		}
		set ^= wrong
	}
	return false
}

// inverse is that of the Gram matrix on a set, 0 elsewhere.
func (s *nearest) inverse(set uint64) []float64 {
	if s.kept != nil && set == s.last {
		return s.kept
	}
	inv, ok := s.inv[set]
	if !ok {
		idx := make([]int, 0, s.n)
		for left := set; left != 0; left &= left - 1 {
			idx = append(idx, bits.TrailingZeros64(left))
		}
		inv = inverse(s.gram, s.n, idx)
		s.inv[set] = inv
	}
	s.last, s.kept = set, inv
	return inv
}

// solveDraws replaces every draw z that has a negative amount by the x ≥ 0 that
// minimises (x − z)'G(x − z).
func solveDraws(draws, gram []float64, n int) {
	var hard []int
	s := newNearest(gram, n)
	for d := range len(draws) / n {
		z := draws[d*n : (d+1)*n]
		for _, v := range z {
			if v < 0 {
				if n > 64 || !s.solve(z) {
					hard = append(hard, d)
				}
				break
			}
		}
	}
	if hard != nil {
		solveHard(draws, gram, n, hard)
	}
}

// solveHard does the same by the active set of package nnls.
func solveHard(draws, gram []float64, n int, hard []int) {
	s := mat.NewSymDense(n, append([]float64(nil), gram...))
	var chol mat.Cholesky
	if !finite(s) || !chol.Factorize(s) {
		return
	}
	var u mat.TriDense
	chol.UTo(&u)
	z, rhs, dst := mat.NewDense(len(hard), n, nil), mat.NewDense(len(hard), n, nil), mat.NewDense(len(hard), n, nil)
	for r, d := range hard {
		z.SetRow(r, draws[d*n:(d+1)*n])
	}
	rhs.Mul(z, u.T())
	batch, err := nnls.NewBatch(&u, &nnls.Settings{Workers: 1})
	if err != nil {
		return
	}
	results, _ := batch.SolveTo(dst, rhs, nil) // results mark what failed one by one
	for r, d := range hard {
		if results[r].Status == nnls.Optimal {
			copy(draws[d*n:(d+1)*n], dst.RawRowView(r))
		}
	}
}
