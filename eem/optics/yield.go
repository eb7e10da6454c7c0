package optics

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// YieldStandard is a fluorophore of known quantum yield. Yields of one substance
// differ with medium and concentration (quinine sulfate: 0.51, 0.546 and 0.60 are
// all in print), so that Yield, Refractive and Source have no default.
type YieldStandard struct {
	EEM        *eem.EEM        // corrected like the sample, blank subtracted, photon units
	Absorbance *eem.Absorbance // of the liquid scanned
	Yield      float64         // quantum yield
	Refractive float64         // refractive index of its medium
	Source     string
}

// Yield returns the apparent quantum yield of a sample excited at exNM against a
// standard:
//
//	Φ = Φ_s · (S/S_s) · (f_s/f) · (n²/n_s²),  f = 1 − 10^(−A)
//
// with S the area under the corrected emission over window (nm, trapezoids) and A
// the absorbance of 1 cm at exNM: Resch-Genger & Rurack 2013, Pure Appl. Chem.
// 85, 2005. S already corrected for the inner filter is proportional to ln(10)·A
// and not to f: with innerFilter true f is replaced by ln(10)·A. The sample's
// medium is water, n = 1.333.
func Yield(e *eem.EEM, a *eem.Absorbance, exNM float64, window [2]float64, innerFilter bool, s YieldStandard) (float64, error) {
	const nWater = 1.333
	absorbed := func(a *eem.Absorbance) float64 {
		if innerFilter {
			return math.Ln10 * a.PerCM(exNM)
		}
		return -math.Expm1(-math.Ln10 * a.PerCM(exNM))
	}
	if !(s.Yield > 0) || !(s.Refractive >= 1) {
		return math.NaN(), fmt.Errorf("a yield standard needs its quantum yield and the refractive index of its medium (%g and %g given)", s.Yield, s.Refractive)
	}
	f, fs := absorbed(a), absorbed(s.Absorbance)
	if !(f > 0) || !(fs > 0) {
		return math.NaN(), fmt.Errorf("sample or standard absorbs nothing at ex %g nm, or its absorbance was not measured there", exNM)
	}
	area, err := emitted(e, exNM, window)
	if err != nil {
		return math.NaN(), err
	}
	std, err := emitted(s.EEM, exNM, window)
	if err != nil {
		return math.NaN(), fmt.Errorf("yield standard: %w", err)
	}
	if !(std > 0) {
		return math.NaN(), fmt.Errorf("the yield standard emits nothing at ex %g nm", exNM)
	}
	n := nWater / s.Refractive
	return s.Yield * area / std * fs / f * n * n, nil
}

// emitted integrates the emission at exNM over window by trapezoids of 1 nm.
func emitted(e *eem.EEM, exNM float64, window [2]float64) (float64, error) {
	sum := 0.0
	n := max(1, math.Ceil(window[1]-window[0]))
	step := (window[1] - window[0]) / n
	for i := range int(n) + 1 {
		em := window[0] + float64(i)*step
		v, _, ok := at(e, exNM, em)
		if !ok {
			return 0, fmt.Errorf("the EEM has no value at ex %g, em %g nm", exNM, em)
		}
		w := step
		if i == 0 || i == int(n) {
			w /= 2
		}
		sum += w * v.v
	}
	return sum, nil
}
