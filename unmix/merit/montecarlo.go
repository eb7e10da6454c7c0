package merit

import (
	"math"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// drawn is the number of Monte Carlo draws; the ends of an interval then have a
// standard error of about 0.04 u.
const drawn = 4000

// normals returns n standard normal draws, the same for every bottle: each row of
// the second half is one of the first with the opposite sign.
func normals(seed uint64, n int) []float64 {
	rnd := rand.New(rand.NewPCG(seed, 0x6d65726974))
	v := make([]float64, n)
	for i := range n / 2 {
		v[i] = rnd.NormFloat64()
		v[n/2+i] = -v[i]
	}
	return v
}

// tangle is the correlation of two estimates from which on the interval of one
// depends on whether the other is cut at zero: the standard uncertainty with the other
// left out is then under 0.7 of the one with it.
const tangle = 0.7

// entangled lists the components whose estimate is correlated by more than that with
// one of near.
func entangled(cov []float64, n int, near []int) []int {
	var out []int
	for f := range n {
		if slices.Contains(near, f) {
			continue
		}
		for _, h := range near {
			if math.Abs(cov[f*n+h]) > tangle*math.Sqrt(cov[f*n+f]*cov[h*n+h]) {
				out = append(out, f)
				break
			}
		}
	}
	return out
}

// monteCarlo replaces the interval of contributions under three standard
// uncertainties, whose distribution is cut at zero, by the shortest one that holds
// 95 % of what the resolution makes of disturbed data (JCGM 101). The draws are
// made in the space of the contributions around those found, and each is brought
// to the nearest mixture without negative amounts. The same is done for contributions
// that such a one is entangled with: what it cannot be below zero they cannot be above.
func (b *bottle) monteCarlo(total []float64) {
	n := b.e.n
	var near []int
	for f := range n {
		if b.x[f] < 3*b.out.U[f] {
			near = append(near, f)
		}
	}
	if near == nil {
		return
	}
	w := inverse(b.m.gram, n, all(n))
	if w == nil {
		return
	}
	cov := sandwich(w, total, n)
	near = append(near, entangled(cov, n, near)...)
	draws := b.draw(cov)
	if draws == nil {
		return
	}
	solveDraws(draws, b.m.gram, n)
	v := make([]float64, drawn)
	for _, f := range near {
		stretch := TQuantile(0.975, b.out.DF[f]) / z975
		for d := range v {
			v[d] = 0
			if y := draws[d*n+f]; y > 0 {
				v[d] = math.Max(0, b.x[f]+stretch*(y-b.x[f]))
			}
		}
		b.out.Lower[f], b.out.Upper[f] = ShortestInterval(v, 0.95)
	}
}

// draw returns draws × n of normal amounts around those found, nil where the
// covariance is not positive definite.
func (b *bottle) draw(cov []float64) []float64 {
	n := b.e.n
	sd := make([]float64, n)
	for f := range sd {
		sd[f] = math.Sqrt(cov[f*n+f])
	}
	s := mat.NewSymDense(n, nil)
	for f := range n {
		for h := range f + 1 {
			v := cov[f*n+h] / sd[f] / sd[h]
			if f == h {
				v += 1e-12
			}
			s.SetSym(f, h, v)
		}
	}
	var chol mat.Cholesky
	if !finite(s) || !chol.Factorize(s) {
		return nil
	}
	var tri mat.TriDense
	chol.LTo(&tri)
	l := make([]float64, n*n)
	for f := range n {
		for h := range f + 1 {
			l[f*n+h] = tri.At(f, h)
		}
	}
	if b.draws == nil {
		b.draws = make([]float64, drawn*n)
	}
	out := b.draws
	for d := range drawn {
		z := b.e.draws[d*n : (d+1)*n]
		for f := range n {
			v := 0.0
			for h := range f + 1 {
				v += l[f*n+h] * z[h]
			}
			out[d*n+f] = b.x[f] + sd[f]*v
		}
	}
	return out
}
