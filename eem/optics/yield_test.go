package optics_test

import (
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

// TestYieldByHand: SEC-2.8-yield (formula; invented inputs): areas 3.2e6 and 5e6,
// absorbances 0.04 and 0.05, ethanol against water, a yield of 0.6. Here the medium
// with its own index is the standard's, so that the ratio of indices is the inverse.
func TestYieldByHand(t *testing.T) {
	ex, em := steps(t, 350, 350, 1), steps(t, 400, 500, 10)
	level := func(area float64) *eem.EEM { return fill(ex, em, func(_, _ float64) float64 { return area / 100 }) }
	x := optics.Emitter{EEM: level(3.2e6), Absorbance: flatAt(t, 0.04)}
	s := optics.YieldStandard{Emitter: optics.Emitter{EEM: level(5e6), Absorbance: flatAt(t, 0.05)}, Yield: 0.6, Refractive: 1.333, Source: "test"}
	const want, indices = 0.4940206316118437, 1.0409203951400454 // Phi_x with n_x = 1.36, and (1.36/1.333)²
	got, err := optics.Yield(x, s, 350, [2]float64{400, 500})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "yield", got, want/indices, 1e-12)
	s.Refractive = 1.36
	got, _ = optics.Yield(x, s, 350, [2]float64{400, 500})
	near(t, "standard in ethanol", got, want/indices/indices, 1e-12)
	s.Refractive, x.InnerFilter, s.InnerFilter = 1.333, true, true
	got, _ = optics.Yield(x, s, 350, [2]float64{400, 500})
	near(t, "inner filter corrected", got, 0.6*3.2/5*0.05/0.04, 1e-12)
}

// TestAbsorbedShare: SEC-2.8-f (computed): at A = 0.05 a liquid whose inner filter is
// not corrected absorbs 0.108749, and not ln(10)·A = 0.115129, 5.87 % more.
func TestAbsorbedShare(t *testing.T) {
	e := fill(steps(t, 350, 350, 1), steps(t, 400, 500, 10), func(_, _ float64) float64 { return 1 })
	x := optics.Emitter{EEM: e, Absorbance: flatAt(t, 0.05)}
	s := optics.YieldStandard{Emitter: x, Yield: 1, Refractive: 1.333}
	s.InnerFilter = true
	got, err := optics.Yield(x, s, 350, [2]float64{400, 500})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "ln(10)·A over 1 − 10^−A", got, 1.05866894549669377, 1e-12)
}

// TestYieldBridges: a band cut out of a straight line changes nothing; cut out of a
// fifth and more of the window it refuses the yield, as at an end.
func TestYieldBridges(t *testing.T) {
	ex, em := steps(t, 350, 350, 1), steps(t, 370, 600, 1)
	line := func() *eem.EEM { return fill(ex, em, func(_, m float64) float64 { return 700 - m }) }
	s := optics.YieldStandard{Emitter: optics.Emitter{EEM: line(), Absorbance: flatAt(t, 0.05)}, Yield: 0.5, Refractive: 1.333}
	for _, c := range []struct {
		from, to float64
		refused  string
	}{{387, 412, ""}, {387, 440, "was not measured"}, {370, 375, "no value at ex 350, em 370"}} {
		e := line()
		for k := range em.Len() {
			if m := em.At(k); m >= c.from && m <= c.to {
				e.Drop(k, eem.Raman1)
			}
		}
		ix := optics.YieldIndex(optics.Emitter{EEM: e, Absorbance: flatAt(t, 0.05)}, s, 350, [2]float64{370, 600})
		if c.refused != "" {
			if !strings.Contains(ix.Refused, c.refused) {
				t.Errorf("cut %g–%g: %+v", c.from, c.to, ix)
			}
			continue
		}
		near(t, "bridged", ix.Value, 0.5, 1e-12)
	}
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
	got, err := optics.Yield(optics.Emitter{EEM: e, Absorbance: a, InnerFilter: true},
		optics.YieldStandard{Emitter: optics.Emitter{EEM: std, Absorbance: sa, InnerFilter: true}, Yield: sf.Yield, Refractive: 1.333}, 350, [2]float64{350, 690})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "yield", got, f.Yield, 0.01) // 1 % of the peat's emission lies outside the window
}

// TestYieldRefused: nothing is guessed.
func TestYieldRefused(t *testing.T) {
	e := fill(steps(t, 350, 350, 1), steps(t, 400, 500, 10), func(_, _ float64) float64 { return 1 })
	s := optics.YieldStandard{Emitter: optics.Emitter{EEM: e, Absorbance: flatAt(t, 0.05)}, Yield: 0.5, Refractive: 1.333}
	of := func(a float64) optics.Emitter { return optics.Emitter{EEM: e, Absorbance: flatAt(t, a)} }
	w := [2]float64{400, 500}
	for want, f := range map[string]func() error{
		"needs its quantum yield": func() error {
			_, err := optics.Yield(of(1), optics.YieldStandard{Emitter: s.Emitter}, 350, w)
			return err
		},
		"no absorbance is given": func() error { _, err := optics.Yield(optics.Emitter{EEM: e}, s, 350, w); return err },
		"nothing is absorbed":    func() error { _, err := optics.Yield(of(0), s, 350, w); return err },
		"em 510 nm":              func() error { _, err := optics.Yield(of(1), s, 350, [2]float64{400, 510}); return err },
	} {
		if err := f(); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
}
