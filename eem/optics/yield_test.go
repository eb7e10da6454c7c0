package optics_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/synth"
)

// flatAt is a spectrum of constant absorbance.
func flatAt(t *testing.T, a float64) *eem.Absorbance {
	return &eem.Absorbance{Axis: steps(t, 300, 400, 100), A: []float64{a, a}, PathCM: 1}
}

// TestYieldByHand: METHODS 2.8 (computed): at A = 0.05 f is 0.108749 and not
// ln(10)·A = 0.115129; half the light of a standard with a tenth of the
// absorbance more, in the same medium.
func TestYieldByHand(t *testing.T) {
	ex, em := steps(t, 350, 350, 1), steps(t, 400, 500, 10)
	std := fill(ex, em, func(_, _ float64) float64 { return 2 })
	e := fill(ex, em, func(_, _ float64) float64 { return 1 })
	s := optics.YieldStandard{EEM: std, Absorbance: flatAt(t, 0.05), Yield: 0.546, Refractive: 1.333, Source: "test"}
	got, err := optics.Yield(e, flatAt(t, 0.055), 350, [2]float64{400, 500}, false, s)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "yield", got, 0.546*0.5*0.108749/(1-math.Pow(10, -0.055)), 1e-5)
	got, _ = optics.Yield(e, flatAt(t, 0.055), 350, [2]float64{400, 500}, true, s)
	near(t, "inner filter corrected", got, 0.546*0.5*0.05/0.055, 1e-12)
	s.Refractive = 1.36 // ethanol; (n_EtOH/n_water)² = 1.0409
	got, _ = optics.Yield(e, flatAt(t, 0.05), 350, [2]float64{400, 500}, false, s)
	near(t, "from ethanol", got, 0.546*0.5/1.0409, 1e-4)
}

// TestYieldOfSimulator: the yield that the simulator was given, back from its
// perfectly corrected EEM against another substance.
func TestYieldOfSimulator(t *testing.T) {
	in := synth.NewInstrument()
	in.Em = steps(t, 300, 700, 2)
	one := func(name string, amount float64) (*eem.EEM, *eem.Absorbance, *synth.Fluorophore) {
		f := synth.Substance(name)
		f.Inert = synth.Tail{} // all it absorbs may become fluorescence
		l := synth.Liquid{}.With(synth.Dose{Of: f, Amount: amount})
		a := synth.NewPhotometer().Scan(l, nil)
		return in.Ideal(l), a, f
	}
	std, sa, sf := one("brightener", 2)
	e, a, f := one("peat extract", 2)
	got, err := optics.Yield(e, a, 350, [2]float64{350, 690}, true, optics.YieldStandard{EEM: std, Absorbance: sa, Yield: sf.Yield, Refractive: 1.333})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "yield", got, f.Yield, 0.01) // 1 % of the peat's emission lies outside the window
}

// TestYieldRefused: nothing is guessed.
func TestYieldRefused(t *testing.T) {
	e := fill(steps(t, 350, 350, 1), steps(t, 400, 500, 10), func(_, _ float64) float64 { return 1 })
	s := optics.YieldStandard{EEM: e, Absorbance: flatAt(t, 0.05), Yield: 0.5, Refractive: 1.333}
	w := [2]float64{400, 500}
	for want, f := range map[string]func() error{
		"needs its quantum yield": func() error {
			_, err := optics.Yield(e, flatAt(t, 1), 350, w, false, optics.YieldStandard{EEM: e})
			return err
		},
		"absorbs nothing": func() error { _, err := optics.Yield(e, flatAt(t, 0), 350, w, false, s); return err },
		"em 501 nm":       func() error { _, err := optics.Yield(e, flatAt(t, 1), 350, [2]float64{400, 510}, false, s); return err },
	} {
		if err := f(); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
}
