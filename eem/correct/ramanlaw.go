package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// RamanRatio is water's Raman area at one excitation over that at the reference.
type RamanRatio struct {
	ExNM  float64
	Ratio float64 // found
	Want  float64 // (ExNM / reference)^−n
}

// Exponents n of the law by which water's Raman scattering falls with the exciting
// wavelength, 250–500 nm: Bartlett et al. 1998, Appl. Opt. 37, 3324.
const (
	RamanEnergy  = 5.5 // ± 0.4, spectra in energy units
	RamanPhotons = 5.3 // ± 0.3, spectra in photon units
)

// RamanLaw compares the Raman areas of a spectrally corrected blank with the law
// at every excitation in 250–500 nm where the line was scanned. The line is
// taken over the shifts 2400–4650 cm⁻¹ (382–418 nm at ex 350, its extent on nine
// instruments: Appl. Spectrosc. 2011, 65, 233) above a straight baseline.
// Excitations whose line is not covered are left out; the reference, nm, must be
// covered.
func RamanLaw(blank *eem.EEM, refNM, exponent float64) ([]RamanRatio, error) {
	const lo, hi = 2400, 4650 // cm⁻¹
	line := func(ex float64) [2]float64 { return [2]float64{1e7 / (1e7/ex - lo), 1e7 / (1e7/ex - hi)} }
	ref, err := Area(blank, refNM, line(refNM), StraightBaseline)
	if err != nil {
		return nil, err
	}
	if !usable(ref) {
		return nil, fmt.Errorf("the Raman area at ex %g nm is %s; a blank with light in it has a positive one", refNM, num(ref))
	}
	var out []RamanRatio
	for j := range blank.Ex.Len() {
		ex := blank.Ex.At(j)
		if ex < 250 || ex > 500 {
			continue
		}
		if a, err := Area(blank, ex, line(ex), StraightBaseline); err == nil {
			out = append(out, RamanRatio{ExNM: ex, Ratio: a / ref, Want: math.Pow(ex/refNM, -exponent)})
		}
	}
	return out, nil
}

// CheckRamanLaw appends to a spectrally corrected blank how far its Raman areas
// depart from the law and flags the largest departure above limit percent
// (raman-law; limit 0 means the test's default): the excitation factors are off
// there.
func CheckRamanLaw(blank *eem.EEM, refNM, exponent, limit float64) *eem.EEM {
	out := blank.Clone()
	limit = defaultLimit("raman-law", limit)
	rs, err := RamanLaw(blank, refNM, exponent)
	if err != nil {
		out.Note(record(StepSpectral, "Raman law not checked: "+err.Error()))
		return out
	}
	var worst RamanRatio
	dev := 0.0
	for _, r := range rs {
		if d := 100 * (r.Ratio/r.Want - 1); math.Abs(d) > math.Abs(dev) {
			worst, dev = r, d
		}
	}
	out.Note(record(StepSpectral, fmt.Sprintf("water's Raman areas at %d excitations follow their law to %.1f %%", len(rs), math.Abs(dev)),
		eem.Param{Name: "Raman law, exponent", Value: num(exponent), Source: "Bartlett et al. 1998, Appl. Opt. 37, 3324"},
		eem.Param{Name: "Raman law, largest departure", Value: num(dev), Unit: "%", Source: "blank"}))
	if math.Abs(dev) > limit {
		out.Note(finding(StepSpectral, "raman-law", dev, limit, fmt.Sprintf(
			"the Raman area at ex %s nm over that at %s nm is %.3g, %.0f %% off the %.3g that water gives; check the excitation factors", eem.NM(worst.ExNM), eem.NM(refNM), worst.Ratio, dev, worst.Want)))
	}
	return out
}
