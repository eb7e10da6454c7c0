package scatter_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/eem/synth"
)

// The simulator of eem/synth is written from the physics alone and shares no code
// with this package; its ridges and offsets are the known truth here.

func scan(in *synth.Instrument, l synth.Liquid, seed uint64) *eem.EEM {
	return in.Scan(l, rand.New(rand.NewPCG(seed, 1)))
}

// unclipped is the simulator's instrument with a detector that takes any light,
// so that the Rayleigh ridge shows its top.
func unclipped() *synth.Instrument {
	in := synth.NewInstrument()
	in.Saturation = 0
	return in
}

// TestRidgeOfKnownShape: a Gaussian ridge 0.7 nm off its line is found there.
func TestRidgeOfKnownShape(t *testing.T) {
	e := fill(steps(t, 300, 320, 10), steps(t, 250, 400, 2), func(ex, em float64) float64 {
		d := (em - ex - 0.7) / 4
		return 50 + 0.1*em + 1000*math.Exp(-d*d/2)
	})
	ps := scatter.Ridge(e, scatter.Rayleigh1, 30)
	if len(ps) != 3 {
		t.Fatalf("%d ridges, want 3", len(ps))
	}
	for _, p := range ps { // 9.42 = 2√(2 ln 2)·4
		if math.Abs(p.Em-p.Want-0.7) > 0.05 || math.Abs(p.Width-9.42) > 0.2 || math.Abs(p.Height-1000) > 20 {
			t.Errorf("ex %g: %+v", p.ExNM, p)
		}
	}
}

// TestRidgeLeaves: noise has no ridge, a clipped top tells no position, and a
// window past the grid is not looked at.
func TestRidgeLeaves(t *testing.T) {
	rnd := rand.New(rand.NewPCG(3, 1))
	noise := fill(steps(t, 300, 400, 5), steps(t, 250, 500, 2), func(_, _ float64) float64 { return rnd.NormFloat64() })
	if ps := scatter.Ridge(noise, scatter.Rayleigh1, 30); len(ps) > 1 {
		t.Errorf("%d ridges in noise", len(ps))
	}
	e := fill(steps(t, 300, 320, 10), steps(t, 275, 400, 1), func(ex, em float64) float64 { return 100 / (1 + math.Abs(em-ex)) })
	e.Drop(e.Index(1, 310-275), eem.Saturated)
	ps := scatter.Ridge(e, scatter.Rayleigh1, 30)
	if len(ps) != 1 || ps[0].ExNM != 320 {
		t.Errorf("%+v; ex 300 is too near the end, 310 is clipped", ps)
	}
}

// TestWavelengthOffset: monochromators that are off are found out to a quarter of
// a nanometre on pure water and flagged beyond the limit; right ones are not.
func TestWavelengthOffset(t *testing.T) {
	for _, c := range []struct {
		ex, em float64
		flag   bool
	}{{0, 0, false}, {0.4, 0, false}, {0, 2, true}, {-1, 1, true}, {0, -2.5, true}} {
		in := unclipped()
		in.Off = [2]float64{c.ex, c.em}
		e := scan(in, synth.Liquid{}, 5)
		s, ok := scatter.Offset(scatter.Ridge(e, scatter.Rayleigh1, 14))
		// Light of ex + Off passes where the emission shows ex + Off_ex − Off_em.
		if want := c.ex - c.em; !ok || math.Abs(s.NM-want) > 0.25 {
			t.Errorf("off by %g and %g nm: found %+v (%v), want %g", c.ex, c.em, s, ok, want)
		}
		out := scatter.CheckWavelength(e, scatter.Rayleigh1, 14, 0)
		if got := len(out.Notes) == 2 && out.Notes[1].Test == "wavelength"; got != c.flag {
			t.Errorf("off by %g and %g nm: flagged %v: %+v", c.ex, c.em, got, out.Notes)
		}
	}
}

// TestAutoBand: outside the band made from the Rayleigh ridge of pure water, less
// of it is left than three standard deviations of the noise, and the band is no
// wider than five ridge widths; the Raman band holds the line and as little.
func TestAutoBand(t *testing.T) {
	for _, bandpass := range []float64{2, 3, 6} {
		in := unclipped()
		in.Bandpass = [2]float64{bandpass, bandpass}
		e, clean := scan(in, synth.Liquid{}, 6), in.Scan(synth.Liquid{}, nil)
		ps := scatter.Ridge(e, scatter.Rayleigh1, 7*bandpass)
		b, ok := scatter.AutoBand(ps, scatter.Rayleigh1, eem.Rayleigh1)
		if s, _ := scatter.Offset(ps); !ok || b.Below+b.Above > 5*s.Width {
			t.Fatalf("bandpass %g: cut %g + %g nm (%v), ridge %g wide", bandpass, b.Below, b.Above, ok, s.Width)
		}
		for _, p := range ps {
			j, _ := e.Ex.Find(p.ExNM)
			k := e.Em.Nearest(p.ExNM - b.Below - 1)
			if left := clean.At(j, k) - in.Offset; e.Em.At(k) < p.ExNM-b.Below && left > 3*in.Read {
				t.Errorf("bandpass %g, ex %g: %.1f counts left at em %g", bandpass, p.ExNM, left, e.Em.At(k))
			}
		}
		ps = scatter.Ridge(e, scatter.Raman1, 25)
		b, ok = scatter.AutoBand(ps, scatter.Raman1, eem.Raman1)
		if s, _ := scatter.Offset(ps); !ok || b.Below < s.Width || b.Above < s.Width || b.Below+b.Above > 5*s.Width {
			t.Errorf("bandpass %g: Raman cut %g + %g nm (%v), ridge %g wide", bandpass, b.Below, b.Above, ok, s.Width)
		}
	}
}

// TestSeen: a bottle that got 1, 0.4 and 0 of its blanks' light, with little and
// with much fluorescence, over ten seeds.
func TestSeen(t *testing.T) {
	in := unclipped()
	in.ExWindow, in.EmWindow = [2]float64{}, [2]float64{} // no inner filter
	blank := scan(in, synth.Liquid{}, 100)
	glow := synth.Liquid{}.With(synth.Dose{Of: synth.Substance("peat extract"), Amount: 1})
	for _, c := range []struct {
		power float64
		l     synth.Liquid
		test  string
	}{{1, synth.Liquid{}, ""}, {1, glow, ""}, {0.4, synth.Liquid{}, "low-light"}, {0.4, glow, "low-light"}, {1e-3, synth.Liquid{}, "no-light"}} {
		for seed := range uint64(10) {
			bad := *in
			bad.Power = c.power
			e := scan(&bad, c.l, seed)
			r, u, ok := scatter.Seen(e, blank, scatter.Raman1, 25)
			if !ok || math.Abs(r-c.power) > 4*u+0.02 {
				t.Errorf("power %g, seed %d: %.4f ± %.4f (%v)", c.power, seed, r, u, ok)
			}
			notes := scatter.CheckLight(e, blank, scatter.Raman1, 25, 0).Notes
			if got := notes[len(notes)-1].Test; got != c.test {
				t.Errorf("power %g: flagged %q, want %q", c.power, got, c.test)
			}
		}
	}
}
