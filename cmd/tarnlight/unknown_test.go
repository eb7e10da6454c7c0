package main

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
	"tarnlight/unmix/merit"
)

// search looks for an unknown in the samples of a simulated survey.
func search(t testing.TB, j *job) *merit.Unknown {
	t.Helper()
	var rows []int
	for _, b := range j.sv.Bottles {
		if b.Usable() && b.Row.Kind == survey.Sample {
			rows = append(rows, j.row[b])
		}
	}
	us, err := merit.FindUnknowns(j.cube, j.res[0], rows, j.sources(j.res[0]), j.judge[0].Spreads)
	if err != nil {
		t.Fatal(err)
	}
	if us == nil {
		return nil
	}
	return us[0]
}

// A dyestuff that the references lack, in 3 of 40 samples at 2, 5 and 20 times the
// noise of a cell: found at 5 and 20, its peak within a grid step (emission: 2 nm, of a
// band of 90 nm), in the right samples; at 5 in nine of ten surveys (why a
// sample or two is left out in the others was not traced).
//
// 40 surveys: found in all at 2, 5 and 20, in the right samples in 29, 38 and 40, peak
// right in 25, 40 and 40.
func TestPlantedUnknown(t *testing.T) {
	testkit.Heavy(t)
	n, long := surveys(t, 2)
	all := []float64{5}
	if long {
		all = []float64{2, 5, 20}
	}
	counts := make([]planted, len(all))
	for seed := range n {
		p := plant(t, uint64(seed)+1, long)
		for a, times := range all {
			p.at(t, times, &counts[a])
		}
	}
	for a, times := range all {
		c := counts[a]
		t.Logf("%g times the noise: %v", times, c)
		right := n
		if times < 20 {
			right -= n / 10
		}
		if times >= 5 && (c.right < right || c.near < n) {
			t.Errorf("%g times the noise: %v, of %d", times, c, n)
		}
	}
}

// planted counts surveys with an unknown: those in which it was found, in the right
// samples, and its peak within a grid step; and sums the squares of what that is off
// over its standard error, where that is known.
type planted struct {
	found, right, near int
	over               [2]float64 // by excitation and emission
	known              [2]int
}

func (c planted) String() string {
	return fmt.Sprintf("found in %d, in the right samples in %d, peak right in %d; off by %.2f (excitation) and %.2f (emission) standard errors, rms of %d and %d",
		c.found, c.right, c.near, math.Sqrt(c.over[0]/float64(c.known[0])), math.Sqrt(c.over[1]/float64(c.known[1])), c.known[0], c.known[1])
}

// spill is a survey in which the dyestuff may be planted.
type spill struct {
	seed  uint64
	long  bool
	one   *eem.EEM // of 1 µg/L
	top   int      // its highest cell
	noise map[string]float64
}

func (p *spill) survey() *synth.Survey {
	d := erring(p.seed, p.long)
	d.Samples, d.Unknown = 40, 0
	s := d.Survey()
	s.Settings = erringSettings
	return s
}

// plant learns the noise of the first samples without the dyestuff.
func plant(t *testing.T, seed uint64, long bool) *spill {
	t.Helper()
	p := &spill{seed: seed, long: long, noise: map[string]float64{}}
	s := p.survey()
	p.one = s.Instrument.Ideal(synth.Liquid{}.With(synth.Dose{Of: synth.Substance("dyestuff"), Amount: 1}))
	p.top = floats.MaxIdx(p.one.F)
	clean := simulated(t, s, false)
	for _, b := range s.Bottles {
		if len(p.noise) < 3 && b.Kind == "sample" {
			p.noise[b.ID] = float64(clean.cube.SampleU(slices.Index(clean.cube.IDs, b.ID))[p.top])
		}
	}
	return p
}

// peak is where the dyestuff is brightest, nm, by the parabola through the highest
// cell and its neighbours.
func (p *spill) peak() (ex, em float64) {
	vertex := func(a eem.Axis, i int, at func(i int) float64) float64 {
		l, m, r := at(i-1), at(i), at(i+1)
		return a.At(i) + (a.At(i+1)-a.At(i))*(l-r)/(l-2*m+r)/2
	}
	nk := p.one.Em.Len()
	j, k := p.top/nk, p.top%nk
	return vertex(p.one.Ex, j, func(j int) float64 { return p.one.At(j, k) }), vertex(p.one.Em, k, func(k int) float64 { return p.one.At(j, k) })
}

// at plants the dyestuff at so many times the noise and counts what is found.
func (p *spill) at(t *testing.T, times float64, c *planted) {
	t.Helper()
	s := p.survey()
	for b := range s.Bottles {
		if noise, ok := p.noise[s.Bottles[b].ID]; ok {
			s.Bottles[b].Liquid = s.Bottles[b].Liquid.With(synth.Dose{Of: synth.Substance("dyestuff"), Amount: times * noise / p.one.F[p.top]})
		}
	}
	j := simulated(t, s, false)
	u := search(t, j)
	if u == nil {
		t.Logf("%g times, seed %d: none", times, p.seed)
		return
	}
	c.found++
	var shown []string
	for _, row := range u.Shown {
		shown = append(shown, j.cube.IDs[row])
	}
	if slices.Equal(slices.Sorted(maps.Keys(p.noise)), slices.Sorted(slices.Values(shown))) {
		c.right++
	}
	nk := p.one.Em.Len()
	exAt, emAt := p.top/nk, p.top%nk
	if math.Abs(float64(p.one.Ex.Nearest(u.ExNM)-exAt)) <= 1 && math.Abs(float64(p.one.Em.Nearest(u.EmNM)-emAt)) <= 1 {
		c.near++
	}
	ex, em := p.peak()
	for mode, over := range []float64{(u.ExNM - ex) / u.ExU, (u.EmNM - em) / u.EmU} {
		if over == over {
			c.over[mode], c.known[mode] = c.over[mode]+over*over, c.known[mode]+1
		}
	}
	t.Logf("%g times, seed %d: %s (truth %.1f/%.1f) in %v", times, p.seed, u.Place(), ex, em, shown)
}

// Clean surveys show no unknown: 60 surveys, none.
func TestNoUnknown(t *testing.T) {
	n, long := surveys(t, 3)
	false1 := 0
	for seed := range n {
		d := erring(uint64(seed)+101, long)
		s := d.Survey()
		s.Settings = erringSettings
		j := simulated(t, s, false)
		if u := search(t, j); u != nil {
			false1++
			t.Logf("seed %d: %s in %d rows, Z up to %.1f", seed+101, u.Component.Name, len(u.Shown), u.Z[u.Shown[0]])
		}
	}
	t.Logf("%d of %d clean surveys show an unknown", false1, n)
	if float64(false1) > merit.FalseUnknowns*float64(n)+3*math.Sqrt(merit.FalseUnknowns*float64(n)) {
		t.Errorf("%d of %d clean surveys show an unknown, stated rate %g", false1, n, merit.FalseUnknowns)
	}
}
