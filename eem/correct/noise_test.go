package correct_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/synth"
)

func scanOf(in *synth.Instrument, l synth.Liquid, seed uint64) *eem.EEM {
	return in.Scan(l, rand.New(rand.NewPCG(seed, 2)))
}

// TestFitNoise: the simulator's read and shot noise from three blanks of lamps
// that drift by 2 %, with a spike in one and the Rayleigh line clipped.
func TestFitNoise(t *testing.T) {
	for _, c := range []struct{ read, perPhoton float64 }{{4, 1}, {10, 0.2}, {1, 5}} {
		in := synth.NewInstrument()
		in.Read, in.PerPhoton = c.read, c.perPhoton
		var blanks []*eem.EEM
		for i, power := range []float64{0.98, 1, 1.02} {
			day := *in
			day.Power = power
			blanks = append(blanks, correct.Saturate(scanOf(&day, synth.Liquid{}, uint64(i)), in.Saturation))
		}
		blanks[1].F[3000] += 1e5
		n, err := correct.FitNoise(blanks, in.Offset)
		if err != nil {
			t.Fatal(err)
		}
		// Over 30 seeds: read within 4 %, mean 0.5 %; shot, which some 15 groups of
		// bright cells tell, within 20 %, mean 1 %.
		if math.Abs(n.Read-c.read) > 0.06*c.read || math.Abs(n.Shot-c.perPhoton) > 0.25*c.perPhoton {
			t.Errorf("read %g, shot %g: found %+v", c.read, c.perPhoton, n)
		}
	}
}

// TestFitNoiseFewCells: a grid of 176 cells has fewer bright ones than make a full
// group, and still tells of shot noise, without bias.
func TestFitNoiseFewCells(t *testing.T) {
	in := synth.NewInstrument()
	ex, _ := eem.Steps(240, 450, 30)
	em, _ := eem.Steps(280, 600, 15)
	in.Grid = eem.Grid{Ex: ex, Em: em}
	const tries = 40
	read, shot := 0.0, 0.0
	for seed := range uint64(tries) {
		var blanks []*eem.EEM
		for i := range uint64(3) {
			blanks = append(blanks, correct.Saturate(scanOf(in, synth.Liquid{}, 10*seed+i), in.Saturation))
		}
		n, err := correct.FitNoise(blanks, in.Offset)
		if err != nil {
			t.Fatal(err)
		}
		read, shot = read+n.Read/in.Read/tries, shot+n.Shot/in.PerPhoton/tries
	}
	t.Logf("mean over truth: read %.3f, shot %.3f", read, shot)
	// One fit's shot noise is known to 50 %: a standard error of 8 %.
	if math.Abs(read-1) > 0.05 || math.Abs(shot-1) > 0.25 {
		t.Errorf("mean over truth: read %.3f, shot %.3f", read, shot)
	}
}

// nearLines holds the scatter lines of both orders with 20 nm to each side.
func nearLines(ex, em float64) bool {
	raman := 1e7 / (1e7/ex - 3400)
	for _, line := range []float64{ex, 2 * ex, raman, 2 * raman} {
		if math.Abs(em-line) < 20 {
			return true
		}
	}
	return false
}

// TestNoiseFrom: from one bottle's roughness, on 1 nm steps.
func TestNoiseFrom(t *testing.T) {
	in := synth.NewInstrument()
	em, _ := eem.Steps(280, 600, 1)
	in.Em = em
	l := synth.Liquid{}.With(synth.Dose{Of: synth.Substance("peat extract"), Amount: 2})
	e := correct.Saturate(scanOf(in, l, 1), in.Saturation)
	n, err := correct.NoiseFrom(e, in.Offset, nearLines)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(n.Read-in.Read) > 0.25*in.Read || math.Abs(n.Shot-in.PerPhoton) > 0.2*in.PerPhoton {
		t.Errorf("found %+v, want read %g, shot %g", n, in.Read, in.PerPhoton)
	}
	out := correct.WithNoise(e, n)
	if testCodes(out) != "noise-default" {
		t.Errorf("%q", testCodes(out))
	}
}

// TestNoisePropagates: the variance that the steps carry along is that of
// repeated scans after the same steps.
func TestNoisePropagates(t *testing.T) {
	in := synth.NewInstrument()
	in.Saturation = 0
	l := synth.Liquid{Color: synth.Tail{At254: 0.3, Slope: 0.015}}.With(synth.Dose{Of: synth.Substance("peat extract"), Amount: 2})
	a := synth.NewPhotometer().Scan(l, nil)
	emf, _ := correct.NewFactors(in.Em.Values(), in.EmissionFactors(in.Em), nil, "")
	chain := func(seed uint64) *eem.EEM {
		model := correct.Noise{Read: in.Read, Shot: in.PerPhoton, Offset: in.Offset}
		step := func(e *eem.EEM) *eem.EEM {
			return correct.Spectral(correct.Offset(correct.WithNoise(e, model), in.Offset), nil, emf)
		}
		e, _ := correct.InnerFilter(step(scanOf(in, l, seed)), a, correct.Geometry{Ex: in.ExWindow, Em: in.EmWindow}, 0)
		return correct.Dilute(correct.Blank(e, step(scanOf(in, synth.Liquid{}, seed+1000))), 2)
	}
	const n = 60
	first := chain(0)
	sum, sum2, said := make([]float64, len(first.F)), make([]float64, len(first.F)), make([]float64, len(first.F))
	for seed := range uint64(n) {
		e := chain(seed)
		for i, v := range e.F {
			sum[i], sum2[i], said[i] = sum[i]+v-first.F[i], sum2[i]+(v-first.F[i])*(v-first.F[i]), said[i]+e.Var[i]/n
		}
	}
	ratio, cells := 0.0, 0.0
	for i := range sum {
		if v := (sum2[i] - sum[i]*sum[i]/n) / (n - 1); !math.IsNaN(v) {
			ratio, cells = ratio+v/said[i], cells+1
		}
	}
	// 6,800 cells × 59 degrees of freedom: standard error 0.2 %. What is said is a
	// little high where there is no light, because the model takes the positive part
	// of the noise for light: E[max(0, N(0, 4))] = 1.6 counts on 16 counts².
	if ratio /= cells; math.Abs(ratio-1) > 0.02 {
		t.Errorf("variance seen over variance said: %.4f", ratio)
	}
}

// TestNoiseRefused: what cannot be a noise model is an error.
func TestNoiseRefused(t *testing.T) {
	g := grid(t, []float64{350}, span(400, 500, 1))
	flat := eem.FromCells(g, eem.Counts, make([]float64, g.Cells()))
	if _, err := correct.FitNoise([]*eem.EEM{flat, flat}, 0); err == nil {
		t.Error("two blanks gave a model")
	}
	if n, err := correct.FitNoise([]*eem.EEM{flat, flat, flat}, 0); err == nil {
		t.Errorf("three equal blanks gave %+v", n)
	}
	if _, err := correct.NoiseFrom(eem.FromCells(g, eem.Raman, flat.F), 0, nil); err == nil {
		t.Error("Raman units gave a model")
	}
}
