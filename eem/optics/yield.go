package optics

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"tarnlight/eem"
)

// Emitter is a liquid whose fluorescence and absorbance were both measured.
type Emitter struct {
	EEM         *eem.EEM        // spectrally corrected, photon units, blank subtracted
	Absorbance  *eem.Absorbance // of the liquid that EEM speaks of
	InnerFilter bool            // EEM is corrected for the inner filter
}

// YieldStandard is a fluorophore of known quantum yield. Yields of one substance
// differ with medium and concentration (quinine sulfate: 0.51, 0.546 and 0.60 are
// all in print), so that Yield, Refractive and Source have no default.
type YieldStandard struct {
	Emitter
	Yield      float64 // quantum yield
	Refractive float64 // refractive index of its medium
	Source     string
}

// nWater is the refractive index of water (589 nm, 25 °C, from memory).
const nWater = 1.333

// Yield returns the apparent quantum yield of a water excited at exNM against a
// standard:
//
//	Φ = Φ_s · (S/S_s) · (f_s/f) · (n²/n_s²),  f = 1 − 10^(−A)
//
// with S the area under the corrected emission over window (nm, trapezoids) and A
// the absorbance of 1 cm at exNM: Resch-Genger & Rurack 2013, Pure Appl. Chem.
// 85, 2005. S corrected for the inner filter is proportional to ln(10)·A and not to
// f, which then takes the place of f. Apparent, because everything that absorbs
// counts, whether it can fluoresce or not, and light outside the window does not.
func Yield(x Emitter, s YieldStandard, exNM float64, window [2]float64) (float64, error) {
	if !(s.Yield > 0) || !(s.Refractive >= 1) {
		return math.NaN(), fmt.Errorf("a yield standard needs its quantum yield and the refractive index of its medium (%g and %g given)", s.Yield, s.Refractive)
	}
	area, err := x.perAbsorbed(exNM, window)
	if err != nil {
		return math.NaN(), err
	}
	std, err := s.perAbsorbed(exNM, window)
	if err != nil {
		return math.NaN(), fmt.Errorf("yield standard: %w", err)
	}
	if !(std > 0) {
		return math.NaN(), fmt.Errorf("the yield standard emits nothing at ex %g nm", exNM)
	}
	n := nWater / s.Refractive
	return s.Yield * area / std * n * n, nil
}

// YieldIndex is Yield as an index, refused where it cannot be had.
func YieldIndex(x Emitter, s YieldStandard, exNM float64, window [2]float64) Index {
	v, err := Yield(x, s, exNM, window)
	ix := Index{Name: "quantum_yield", Value: v, U: math.NaN(), Source: "Resch-Genger & Rurack 2013, Pure Appl. Chem. 85, 2005; standard: " + s.Source,
		What: fmt.Sprintf("apparent quantum yield at ex %g nm over em %g–%g nm", exNM, window[0], window[1])}
	if err != nil {
		ix.Refused = err.Error()
	}
	return settled(ix)
}

// perAbsorbed is the emission over window for the light absorbed at exNM.
func (x Emitter) perAbsorbed(exNM float64, window [2]float64) (float64, error) {
	if x.Absorbance == nil {
		return 0, fmt.Errorf("no absorbance is given")
	}
	f := math.Ln10 * x.Absorbance.PerCM(exNM)
	if !x.InnerFilter {
		f = -math.Expm1(-f)
	}
	if !(f > 0) {
		return 0, fmt.Errorf("nothing is absorbed at ex %g nm, or its absorbance was not measured there", exNM)
	}
	area, err := emitted(x.EEM, exNM, window)
	return area / f, err
}

// emitted integrates the emission at exNM over window by trapezoids of about 1 nm.
// Cells that are missing inside it, as where a scatter band was cut out, are bridged
// by a monotone cubic along emission, up to MaxFilled of the window; its ends must be
// there.
func emitted(e *eem.EEM, exNM float64, window [2]float64) (float64, error) {
	n := int(max(1, math.Ceil(window[1]-window[0])))
	step := (window[1] - window[0]) / float64(n)
	bridged := 0
	for i := range n + 1 {
		em := window[0] + float64(i)*step
		_, filled, ok := at(e, exNM, em)
		if !ok && (i == 0 || i == n) {
			return 0, fmt.Errorf("the EEM has no value at ex %g, em %g nm", exNM, em)
		}
		if filled || !ok {
			bridged++
		}
	}
	if float64(bridged) > MaxFilled*float64(n+1) {
		return 0, fmt.Errorf("%.0f %% of em %g–%g nm at ex %g nm was not measured", 100*float64(bridged)/float64(n+1), window[0], window[1], exNM)
	}
	curve := emission(e, exNM)
	sum := (curve.Predict(window[0]) + curve.Predict(window[1])) / 2
	for i := 1; i < n; i++ {
		sum += curve.Predict(window[0] + float64(i)*step)
	}
	return sum * step, nil
}

// emission is the monotone cubic through the cells that are there at exNM.
func emission(e *eem.EEM, exNM float64) interp.Predictor {
	var x, y []float64
	for k := range e.Em.Len() {
		if v, _, ok := at(e, exNM, e.Em.At(k)); ok {
			x, y = append(x, e.Em.At(k)), append(y, v.v)
		}
	}
	if len(x) < 2 {
		return interp.Constant(y[0])
	}
	var c interp.FritschButland
	c.Fit(x, y)
	return &c
}
