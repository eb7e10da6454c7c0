package synth

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"tarnlight/eem"
)

// TrilinearSpec says what Trilinear makes. Shares are of the largest noise-free
// cell of the cube. The zero value of every field but Samples and Components
// works.
type TrilinearSpec struct {
	Samples, Components int // I ≥ 1, F ≥ 1

	Ex, Em eem.Axis // empty means 240–465 nm in steps of 5 (J = 46), 300–600 nm in steps of 2 (K = 151)

	Noise float64 // standard deviation of the noise of every cell, share of the maximum
	Shot  float64 // standard deviation that counting adds at the maximum, share of it; its variance is proportional to the cell
	Known bool    // the cube's U holds the true standard deviations

	Scatter bool    // both Rayleigh bands missing in every sample: 4,756 of 6,946 cells of the standard grid stay
	Gaps    float64 // share of the samples that have a clipped block: their brightest cells missing as Saturated

	Correlation float64 // of the components' log scores, 0 ≤ Correlation < 1
	Weak        float64 // scores of the last component times this; zero means 1
	Rare        int     // the last component is in this many samples alone, as strong there as any; zero means in all
	Absent      float64 // share of scores that are exactly zero
	Close       bool    // neighbouring spectra moved together: emission congruence of about 0.95

	Seed uint64
}

// Truth is what a trilinear cube was made of:
//
//	x_ijk = Σ_f Scores[i][f]·Ex[f][j]·Em[f][k] + noise
//
// Loadings have maximum 1 on the grid, so that a score is an Fmax.
type Truth struct {
	Scores [][]float64 // I × F, unit of the cube
	Ex     [][]float64 // F × J
	Em     [][]float64 // F × K
	Max    float64     // the largest noise-free cell, present or not
}

// Streams of the generator, one a purpose, so that changing the noise leaves
// the spectra and the scores as they were.
const (
	streamSpectra = iota
	streamScores
	streamNoise
	streamGaps
)

// Trilinear makes a cube that follows the trilinear model exactly, plus noise:
// spectra are sums of Gaussians in energy that overlap as those of natural
// water do, scores are log-normal. Equal specs give equal bytes. It panics
// when a field is outside its range.
func Trilinear(s TrilinearSpec) (*eem.Cube, *Truth) {
	s = s.withDefaults()
	g := eem.Grid{Ex: s.Ex, Em: s.Em}
	t := &Truth{}
	t.Ex, t.Em = spectra(g, s)
	t.Scores = scores(s)
	c := &eem.Cube{Grid: g, Unit: eem.Raman, IDs: make([]string, s.Samples)}
	n := g.Cells()
	c.X, c.Why = make([]float64, s.Samples*n), make([]eem.Reason, s.Samples*n)
	for i := range s.Samples {
		c.IDs[i] = fmt.Sprintf("S%04d", i+1)
		t.modelTo(c.Sample(i), i)
		t.Max = max(t.Max, slices.Max(c.Sample(i)))
	}
	clipped := pick(rand.New(rand.NewPCG(s.Seed, streamGaps)), s.Samples, int(math.Round(s.Gaps*float64(s.Samples))))
	mask := make([]eem.Reason, n)
	if s.Scatter {
		mask = rayleighMask(g)
	}
	if s.Known {
		c.U = make([]float32, len(c.X))
	}
	rnd := rand.New(rand.NewPCG(s.Seed, streamNoise))
	for i := range s.Samples {
		why := c.SampleWhy(i)
		copy(why, mask)
		if clipped[i] {
			clip(c.Sample(i), why)
		}
		var u []float32
		if s.Known {
			u = c.U[i*n : (i+1)*n]
		}
		s.disturb(c.Sample(i), why, u, t.Max, rnd)
	}
	return c, t
}

func (s TrilinearSpec) withDefaults() TrilinearSpec {
	if s.Samples < 1 || s.Components < 1 {
		panic(fmt.Sprintf("synth: %d samples of %d components", s.Samples, s.Components))
	}
	if s.Noise < 0 || s.Shot < 0 || s.Gaps < 0 || s.Gaps > 1 || s.Absent < 0 || s.Absent > 1 ||
		s.Correlation < 0 || s.Correlation >= 1 || s.Weak < 0 || s.Rare < 0 || s.Rare > s.Samples {
		panic(fmt.Sprintf("synth: a share outside its range in %+v", s))
	}
	if s.Ex.Len() == 0 {
		s.Ex = steps(240, 465, 5)
	}
	if s.Em.Len() == 0 {
		s.Em = steps(300, 600, 2)
	}
	if s.Weak == 0 {
		s.Weak = 1
	}
	return s
}

// spectra draws the loadings. Emission peaks lie evenly in energy over the
// middle of the axis, at most 3,400 cm⁻¹ apart and shifted by chance; excitation
// has a band above the emission by the Stokes shift and a second one in the
// ultraviolet, as the fluorophores of water have.
func spectra(g eem.Grid, s TrilinearSpec) (ex, em [][]float64) {
	rnd := rand.New(rand.NewPCG(s.Seed, streamSpectra))
	hi, lo := 1e7/g.Em.First(), 1e7/g.Em.Last() // cm⁻¹
	const width = 1600.0
	step := min(0.68*(hi-lo)/float64(max(s.Components-1, 1)), 3400)
	if s.Close {
		step = 0.45 * width
	}
	for f := range s.Components {
		place := float64(s.Components-1)/2 - float64(f)
		peak := (hi+lo)/2 + step*(place+0.3*(rnd.Float64()-0.5))
		stokes := 4000 + 3500*rnd.Float64()
		second := 7000 + 4000*rnd.Float64()
		height := 0.3 + 0.9*rnd.Float64()
		em = append(em, loading(g.Em, []Peak{
			{At: peak, Width: width * (0.85 + 0.3*rnd.Float64()), Height: 1},
			{At: peak - 2000, Width: width * 1.3, Height: 0.15 + 0.3*rnd.Float64()},
		}))
		ex = append(ex, loading(g.Ex, []Peak{
			{At: peak + stokes, Width: 1900 + 900*rnd.Float64(), Height: 1},
			{At: peak + stokes + second, Width: 2600 + 900*rnd.Float64(), Height: height},
		}))
	}
	return ex, em
}

// loading samples the band on the axis and brings its maximum there to 1.
func loading(a eem.Axis, b Band) []float64 {
	v := b.on(a)
	top := slices.Max(v)
	for i := range v {
		v[i] /= top
	}
	return v
}

// scores draws I × F log-normal scores of median 1 and log standard deviation
// 0.7: the strongest of 40 bottles holds some 20 times what the weakest does.
func scores(s TrilinearSpec) [][]float64 {
	const spread = 0.7
	rnd := rand.New(rand.NewPCG(s.Seed, streamScores))
	out := make([][]float64, s.Samples)
	for i := range out {
		out[i] = make([]float64, s.Components)
		common := rnd.NormFloat64()
		for f := range out[i] {
			z := math.Sqrt(s.Correlation)*common + math.Sqrt(1-s.Correlation)*rnd.NormFloat64()
			out[i][f] = math.Exp(spread * z)
			if rnd.Float64() < s.Absent {
				out[i][f] = 0
			}
		}
	}
	last := s.Components - 1
	if s.Rare > 0 {
		has := pick(rnd, s.Samples, s.Rare)
		for i := range out {
			if !has[i] {
				out[i][last] = 0
			}
		}
	}
	for i := range out {
		out[i][last] *= s.Weak
	}
	return out
}

// modelTo writes the noise-free cells of sample i, J × K.
func (t *Truth) modelTo(dst []float64, i int) {
	clear(dst)
	for f, a := range t.Scores[i] {
		if a == 0 {
			continue
		}
		at := 0
		for _, b := range t.Ex[f] {
			ab := a * b
			for _, c := range t.Em[f] {
				dst[at] += ab * c
				at++
			}
		}
	}
}

// disturb adds noise to the cells that are present and empties the others. A
// cell's noise is drawn whether it is present or not: masks change no number.
func (s TrilinearSpec) disturb(x []float64, why []eem.Reason, u []float32, top float64, rnd *rand.Rand) {
	flat, shot := s.Noise*s.Noise, s.Shot*s.Shot
	for i, v := range x {
		sd := top * math.Sqrt(flat+shot*v/top)
		if sd > 0 {
			x[i] += sd * rnd.NormFloat64()
		}
		if u != nil {
			u[i] = float32(sd)
		}
		if why[i] != eem.Measured {
			x[i] = math.NaN()
			if u != nil {
				u[i] = float32(math.NaN())
			}
		}
	}
}
