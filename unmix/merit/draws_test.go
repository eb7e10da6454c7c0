package merit

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// gramOf is K'K of random positive spectra that overlap.
func gramOf(n int, rnd *rand.Rand) []float64 {
	k := mat.NewDense(40, n, nil)
	for f := range n {
		for i := range 40 {
			d := (float64(i) - 40*rnd.Float64()/4 - float64(4*f)) / 8
			k.Set(i, f, math.Exp(-d*d)*(1+float64(f)))
		}
	}
	var g mat.Dense
	g.Mul(k.T(), k)
	return g.RawMatrix().Data
}

// The nearest mixture without negative amounts is that of package nnls, and holds
// the conditions of optimality: x ≥ 0, G(z − x) ≤ 0, each zero where the other is not.
func TestNearest(t *testing.T) {
	rnd := rand.New(rand.NewPCG(5, 6))
	for n := 1; n <= 8; n++ {
		gram := gramOf(n, rnd)
		draws := make([]float64, 300*n)
		for i := range draws {
			draws[i] = rnd.NormFloat64()
		}
		before, other := slices.Clone(draws), slices.Clone(draws)
		var every []int
		for d := range 300 {
			every = append(every, d)
		}
		solveDraws(draws, gram, n)
		solveHard(other, gram, n, every)
		s := newNearest(gram, n)
		for d := range 300 {
			z := slices.Clone(before[d*n : (d+1)*n])
			if !s.solve(z) {
				t.Errorf("%d components, draw %d: no end", n, d)
			}
			for f := range n {
				x := draws[d*n+f]
				if math.Abs(x-other[d*n+f]) > 1e-9 || x < 0 { // condition up to 1e4
					t.Errorf("%d components, draw %d: %v, package nnls %v", n, d, draws[d*n:(d+1)*n], other[d*n:(d+1)*n])
					break
				}
				dual := 0.0
				for h := range n {
					dual += gram[f*n+h] * (before[d*n+h] - draws[d*n+h])
				}
				if size := gram[f*n+f]; dual > 1e-9*size || x > 0 && dual < -1e-9*size {
					t.Errorf("%d components, draw %d: dual %g at %g", n, d, dual, x)
				}
			}
		}
	}
}

// The shortest interval by parts of the order is that by all of it.
func TestShortestByParts(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	for _, m := range []int{1, 2, 3, 20, 101, 4000} {
		v := make([]float64, m)
		for i := range v {
			v[i] = math.Max(0, rnd.NormFloat64()) // half of them alike
		}
		for _, p := range []float64{0.5, 0.9, 0.95, 1} {
			lo, hi := ShortestInterval(slices.Clone(v), p)
			all := slices.Sorted(slices.Values(v))
			q := min(m-1, int(math.Round(p*float64(m))))
			a, b := all[0], all[q]
			for r := 1; r+q < m; r++ {
				if all[r+q]-all[r] < b-a {
					a, b = all[r], all[r+q]
				}
			}
			if lo != a || hi != b {
				t.Errorf("%d draws, %g: %g to %g, want %g to %g", m, p, lo, hi, a, b)
			}
		}
	}
}

func BenchmarkSolveDraws(b *testing.B) {
	rnd := rand.New(rand.NewPCG(7, 8))
	const n = 5
	gram := gramOf(n, rnd)
	z := make([]float64, drawn*n)
	for i := range z {
		z[i] = rnd.NormFloat64()
	}
	for _, way := range []struct {
		name string
		do   func(d []float64)
	}{{"kept inverses", func(d []float64) { solveDraws(d, gram, n) }}, {"package nnls", func(d []float64) { solveHard(d, gram, n, all(drawn)) }}} {
		b.Run(way.name, func(b *testing.B) {
			for range b.N {
				way.do(slices.Clone(z))
			}
		})
	}
}
