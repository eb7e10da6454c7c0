package correct_test

import (
	"math"
	"testing"

	"tarnlight/eem/correct"
	"tarnlight/eem/synth"
)

// TestRamanLaw: SEC-2.5-bartlett (computed; exponent: Bartlett et al. 1998, Appl. Opt. 37, 3324): area at 275, 254
// and 400 nm over that at 350 nm, energy units.
func TestRamanLaw(t *testing.T) {
	for ex, want := range map[float64]float64{275: 3.7674233735001996, 254: 5.831614437942985, 400: 0.4797823768578312} {
		near(t, "ratio", math.Pow(ex/350, -correct.RamanEnergy), want, 1e-12)
	}
}

// TestCheckRamanLaw: the simulator's water, with the lamp's own factors, follows
// the law; with the factors left out, or 30 % wrong in the ultraviolet, the
// departure is flagged.
func TestCheckRamanLaw(t *testing.T) {
	in := synth.NewInstrument()
	in.Saturation = 0
	raw := correct.Offset(scanOf(in, synth.Liquid{}, 3), in.Offset)
	exf, emf := in.ExcitationFactors(in.Ex), in.EmissionFactors(in.Em)
	table := func(nm, f []float64) *correct.Factors {
		c, err := correct.NewFactors(nm, f, nil, "simulator")
		if err != nil {
			t.Fatal(err)
		}
		return c
	}
	em := table(in.Em.Values(), emf)
	if out := correct.CheckRamanLaw(correct.Spectral(raw, table(in.Ex.Values(), exf), em), 350, correct.RamanPhotons, 0); testCodes(out) != "" {
		t.Errorf("right factors: %+v", out.Notes)
	}
	if out := correct.CheckRamanLaw(raw, 350, correct.RamanPhotons, 0); testCodes(out) != "raman-law" {
		t.Errorf("no factors: %+v", out.Notes)
	}
	for j := range exf {
		if in.Ex.At(j) < 300 {
			exf[j] *= 1.3
		}
	}
	if out := correct.CheckRamanLaw(correct.Spectral(raw, table(in.Ex.Values(), exf), em), 350, correct.RamanPhotons, 0); testCodes(out) != "raman-law" {
		t.Errorf("wrong factors: %+v", out.Notes)
	}
}
