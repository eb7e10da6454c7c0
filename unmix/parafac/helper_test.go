package parafac

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// survey is a simulated cube with its truth: bands that are Gaussian in both
// modes, log-normal scores, scatter bands left out of every sample.
type survey struct {
	cube   *eem.Cube
	a      []float64 // I × F
	ex, em [][]float64
}

type simulation struct {
	samples, nj, nk, comps int
	noise                  float64 // of the largest value
	scatter                bool    // leave out first and second order bands
	spread                 float64 // σ of the log of the scores; 0 means 0.6
	seed                   uint64
}

func simulate(m simulation) *survey {
	rnd := rand.New(rand.NewPCG(m.seed, 77))
	if m.spread == 0 {
		m.spread = 0.6
	}
	ex, _ := eem.Steps(240, 240+float64(m.nj-1)*220/float64(max(1, m.nj-1)), 220/float64(max(1, m.nj-1)))
	em, _ := eem.Steps(300, 300+float64(m.nk-1)*300/float64(max(1, m.nk-1)), 300/float64(max(1, m.nk-1)))
	s := &survey{a: make([]float64, m.samples*m.comps)}
	for f := range m.comps {
		at := float64(f) + 0.5 + 0.2*(rnd.Float64()-0.5)
		peakEm := 310 + at*220/float64(m.comps)
		peakEx := peakEm - 60 - 40*rnd.Float64()
		s.ex = append(s.ex, band(ex, peakEx, 18+10*rnd.Float64(), 240, 0.4+0.3*rnd.Float64()))
		s.em = append(s.em, band(em, peakEm, 22+14*rnd.Float64(), 0, 0))
	}
	for i := range s.a {
		s.a[i] = math.Exp(m.spread * rnd.NormFloat64())
	}
	s.fill(eem.Grid{Ex: ex, Em: em}, m, rnd)
	return s
}

// band is a Gaussian with a second one of height h at nm2, of maximum 1.
func band(x eem.Axis, nm, sd, nm2, h float64) []float64 {
	v, most := make([]float64, x.Len()), 0.0
	for i := range v {
		d, d2 := (x.At(i)-nm)/sd, (x.At(i)-nm2)/15
		v[i] = math.Exp(-d*d/2) + h*math.Exp(-d2*d2/2)
		most = math.Max(most, v[i])
	}
	for i := range v {
		v[i] /= most
	}
	return v
}

func (s *survey) fill(g eem.Grid, m simulation, rnd *rand.Rand) {
	n := g.Cells()
	c := &eem.Cube{Grid: g, Unit: eem.Raman, X: make([]float64, m.samples*n), Why: make([]eem.Reason, m.samples*n)}
	most := 0.0
	for i := range m.samples {
		c.IDs = append(c.IDs, fmt.Sprintf("s%03d", i))
		for f := range m.comps {
			for j := range m.nj {
				axpy(s.a[i*m.comps+f]*s.ex[f][j], s.em[f], c.X[i*n+j*m.nk:i*n+(j+1)*m.nk])
			}
		}
	}
	for _, v := range c.X {
		most = math.Max(most, v)
	}
	for i := range m.samples {
		for q := range n {
			at := i*n + q
			c.X[at] += m.noise * most * rnd.NormFloat64()
			ex, em := g.Ex.At(q/m.nk), g.Em.At(q%m.nk)
			if m.scatter && (em < ex+15 || math.Abs(em-2*ex) < 15) {
				c.X[at], c.Why[at] = math.NaN(), eem.Rayleigh1
			}
		}
	}
	s.cube = c
}

// worst returns the smallest congruence of a loading with the truth, over the
// loadings that are determined.
func (s *survey) worst(r *Result) float64 {
	least := 1.0
	for _, p := range Match(s.ex, s.em, r.Ex, r.Em) {
		if p.B < 0 {
			return 0
		}
		least = math.Min(least, math.Min(
			congruenceWhere(s.ex[p.A], r.Ex[p.B], r.ExDetermined[p.B]),
			congruenceWhere(s.em[p.A], r.Em[p.B], r.EmDetermined[p.B])))
	}
	return least
}

func congruenceWhere(x, y []float64, ok []bool) float64 {
	var u, v []float64
	for i := range x {
		if ok[i] {
			u, v = append(u, x[i]), append(v, y[i])
		}
	}
	return Congruence(u, v)
}

// cubeOf makes a cube of i × j × k numbers.
func cubeOf(x []float64, i, j, k int) *eem.Cube {
	ex, _ := eem.Steps(250, 250+10*float64(j-1), 10)
	em, _ := eem.Steps(300, 300+float64(k-1), 1)
	c := &eem.Cube{Grid: eem.Grid{Ex: ex, Em: em}, Unit: eem.Counts, X: x, Why: make([]eem.Reason, len(x))}
	for n := range i {
		c.IDs = append(c.IDs, "s"+strconv.Itoa(n))
	}
	for n, v := range x {
		if math.IsNaN(v) {
			c.Why[n] = eem.NotMeasured
		}
	}
	return c
}

// column reads the first column of a CSV file as numbers, without a header.
func column(t testing.TB, path string) []float64 {
	var out []float64
	for _, r := range testkit.Records(t, path) {
		if v, err := strconv.ParseFloat(strings.TrimSpace(r[len(r)-1]), 64); err == nil {
			out = append(out, v)
		}
	}
	return out
}

// measured reads a shared cube stored as sample × emission × excitation (or
// sample × excitation × emission where exFirst) and leaves out cells by drop.
func measured(t testing.TB, set string, exFirst bool, drop func(ex, em, v float64) bool) *eem.Cube {
	x, shape := testkit.Npy(t, testkit.Shared(t, "data", set, "X.npy"))
	exNM, emNM := column(t, testkit.Shared(t, "data", set, "ex_nm.csv")), column(t, testkit.Shared(t, "data", set, "em_nm.csv"))
	ex, err := eem.NewAxis(exNM)
	if err != nil {
		t.Fatal(err)
	}
	em, err := eem.NewAxis(emNM)
	if err != nil {
		t.Fatal(err)
	}
	g := eem.Grid{Ex: ex, Em: em}
	c := &eem.Cube{Grid: g, Unit: eem.Counts, X: make([]float64, len(x)), Why: make([]eem.Reason, len(x))}
	for i := range shape[0] {
		c.IDs = append(c.IDs, fmt.Sprintf("s%d", i))
		for j := range ex.Len() {
			for k := range em.Len() {
				from := i*g.Cells() + k*ex.Len() + j
				if exFirst {
					from = i*g.Cells() + g.Index(j, k)
				}
				to := i*g.Cells() + g.Index(j, k)
				c.X[to] = x[from]
				if math.IsNaN(x[from]) || drop(ex.At(j), em.At(k), x[from]) {
					c.X[to], c.Why[to] = math.NaN(), eem.NotMeasured
				}
			}
		}
	}
	return c
}
