package parafac

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// CoreConsistency returns the core consistency, percent, of given factors a
// (I × F), b (J × F) and c (K × F), row-major, for the cube x (I × J × K):
//
//	G = X ×₁ A⁺ ×₂ B⁺ ×₃ C⁺,  100 (1 − Σ (g − t)² / F)
//
// with t one on the superdiagonal (Bro & Kiers 2003, J. Chemom. 17, 274). About
// 90 and more says trilinear, near 0 and below says that it is not; a fit of one
// or two components reaches 100 whatever the data, so there it says nothing. NaN
// cells take the model's value. Unless it is 100 it depends on which mode holds
// the scale; the convention is a. It panics when the lengths do not fit.
func CoreConsistency(x, a, b, c []float64, f int) float64 {
	i, j, k := len(a)/f, len(b)/f, len(c)/f
	if len(x) != i*j*k || len(a) != i*f || len(b) != j*f || len(c) != k*f {
		panic(fmt.Sprintf("parafac: %d cells for factors of %d, %d and %d rows", len(x), i, j, k))
	}
	pa := pseudoInverse(a, i, f)
	e := make([]float64, f*j*k)
	for s := range i {
		for q := range j * k {
			v := x[s*j*k+q]
			if math.IsNaN(v) {
				continue
			}
			for g := range f {
				v -= a[s*f+g] * b[q/k*f+g] * c[q%k*f+g]
			}
			for g := range f {
				e[g*j*k+q] += pa[g*i+s] * v
			}
		}
	}
	return consistency(e, pseudoInverse(b, j, f), pseudoInverse(c, k, f), j, k, f, func(q int) (int, int) { return q / k, q % k })
}

// consistency takes A⁺ times the residuals, F × cells, and the other two
// inverses. The core is the superdiagonal plus what this leaves.
func consistency(e, pb, pc []float64, j, k, f int, at func(q int) (int, int)) float64 {
	var off float64
	n := len(e) / f
	half := make([]float64, f*k)
	for g := range f {
		clear(half)
		for q := range n {
			r, s := at(q)
			v := e[g*n+q]
			for h := range f {
				half[h*k+s] += v * pb[h*j+r]
			}
		}
		for h := range f {
			for l := range f {
				d := dot(half[h*k:(h+1)*k], pc[l*k:(l+1)*k])
				off += d * d
			}
		}
	}
	return 100 * (1 - off/float64(f))
}

// pseudoInverse returns A⁺, F × n, of the columns of a, n × F. What the columns
// say about each other to less than 1e-12 does not count.
func pseudoInverse(a []float64, n, f int) []float64 {
	out := make([]float64, f*n)
	scale := make([]float64, f)
	g := mat.NewSymDense(f, nil)
	for x := range f {
		if s := math.Sqrt(columnSquare(a, n, f, x)); s > 0 {
			scale[x] = 1 / s
		}
	}
	gram := make([]float64, f*f)
	gramTo(gram, a, n, f)
	for x := range f {
		for y := x; y < f; y++ {
			g.SetSym(x, y, gram[x*f+y]*scale[x]*scale[y])
		}
	}
	var eig mat.EigenSym
	if !eig.Factorize(g, true) {
		return out
	}
	var v mat.Dense
	eig.VectorsTo(&v)
	inv := make([]float64, f*f)
	for m, l := range eig.Values(nil) {
		if l < 1e-12 {
			continue
		}
		for x := range f {
			for y := range f {
				inv[x*f+y] += v.At(x, m) * v.At(y, m) / l
			}
		}
	}
	for x := range f {
		for r := range n {
			var s float64
			for y := range f {
				s += inv[x*f+y] * scale[y] * a[r*f+y]
			}
			out[x*n+r] = s * scale[x]
		}
	}
	return out
}

// residualTests returns two figures that need the residuals of every sample: the
// core consistency of the fit, in its own scale and weights, where missing cells
// take the model's value; and the mean correlation of neighbouring residuals, along
// emission and excitation, about 0 for noise and towards 1 where the model leaves
// out something with a spectrum.
func (s *als) residualTests() (core, structure float64) {
	s.modelRows()
	pa := pseudoInverse(s.a, s.i, s.f)
	e, r := make([]float64, s.f*s.p), make([]float64, s.p)
	var num, den float64
	for i := range s.i {
		s.residualTo(r, i)
		for g := range s.f {
			axpy(pa[g*s.i+i], r, e[g*s.p:(g+1)*s.p])
		}
		n, d := s.neighbours(r)
		num, den = num+n, den+d
	}
	if den > 0 {
		structure = num / den
	}
	core = consistency(e, pseudoInverse(s.b, s.j, s.f), pseudoInverse(s.c, s.k, s.f), s.j, s.k, s.f, func(q int) (int, int) { return int(s.cj[q]), int(s.ck[q]) })
	return core, structure
}

// neighbours sums products, and mean squares, over the pairs of cells of r that
// are next to each other.
func (s *als) neighbours(r []float64) (num, den float64) {
	for q := 1; q < len(r); q++ {
		if s.ck[q] == s.ck[q-1]+1 && s.cj[q] == s.cj[q-1] {
			num += r[q] * r[q-1]
			den += r[q]*r[q] + r[q-1]*r[q-1]
		}
	}
	for n := 1; n < len(s.emCell); n++ {
		q, p := s.emCell[n], s.emCell[n-1]
		if s.cj[q] == s.cj[p]+1 && s.ck[q] == s.ck[p] {
			num += r[q] * r[p]
			den += r[q]*r[q] + r[p]*r[p]
		}
	}
	return num, den / 2
}

// tripleCosine returns the cosine of largest size between two components,
// cos(a)·cos(b)·cos(c), and the pair. Near −1 two components cancel each other (a
// degenerate fit); with non-negative factors above 0.7 one is shared by two.
func (s *als) tripleCosine() (float64, [2]int) {
	var most float64
	var pair [2]int
	a, b, c := columns(s.a, s.i, s.f), columns(s.b, s.j, s.f), columns(s.c, s.k, s.f)
	for x := range s.f {
		for y := x + 1; y < s.f; y++ {
			if t := Congruence(a[x], a[y]) * Congruence(b[x], b[y]) * Congruence(c[x], c[y]); math.Abs(t) > math.Abs(most) {
				most, pair = t, [2]int{x, y}
			}
		}
	}
	return most, pair
}

// shared says whether two components are one.
func (s *als) shared() bool {
	t, _ := s.tripleCosine()
	return t > sharedTriple && !s.free
}
