package synth

import "math"

// waterRaman is the O–H stretch of water as Raman shift, heights the share of
// each component in the whole. Places and "3230 and 3440 carry more than 90 %":
// published; single shares and widths from memory, chosen so that the maximum
// seen through 3–5 nm lies between 3382 and 3400 cm⁻¹, both in use.
var waterRaman = Band{
	{At: 3070, Width: 90, Height: 0.03},
	{At: 3230, Width: 105, Height: 0.34},
	{At: 3440, Width: 95, Height: 0.58},
	{At: 3610, Width: 60, Height: 0.05},
}

// ramanCoefficient returns how much of the light excited at ex nm water turns
// into Raman light, photons, cm⁻¹:
//
//	b(ex) = 2.7e-6 cm⁻¹ · (ex / 488 nm)^−5.3
//
// Bartlett et al. 1998, Appl. Opt. 37, 3324: (2.7 ± 0.2)e-4 m⁻¹ at 488 nm,
// exponent 5.3 ± 0.3 in photons (5.5 in energy).
func ramanCoefficient(ex float64) float64 { return 2.7e-6 * math.Pow(ex/488, -5.3) }

// elasticCoefficient returns the scattering coefficient of water and particles
// at nm, cm⁻¹. Pure water: 1e-4 cm⁻¹ at 350 nm and λ^−4.32 (Morel 1974, from
// memory).
func elasticCoefficient(nm, turbidity float64) float64 {
	return 1e-4*math.Pow(nm/350, -4.32) + turbidity*math.Pow(nm/350, -1.5)
}

// line is light of a narrow range of wavelengths as the emission monochromator
// shows it.
type line struct {
	light float64 // its true wavelength, nm
	at    float64 // where the scan shows it, nm
	sigma float64 // width in the scan, nm
	area  float64 // cm⁻¹
}

// sigmaOf turns a full width at half maximum into a standard deviation.
const sigmaOf = 1 / 2.3548200450309493

// lines returns the scatter lines excited at ex. What passes the emission
// grating in second order appears at twice its wavelength, and twice as wide
// where the width is the light's own.
func (in *Instrument) lines(ex, turbidity float64) []line {
	bpEx, bpEm := in.Bandpass[0]*sigmaOf, in.Bandpass[1]*sigmaOf
	out := make([]line, 0, 2+2*len(waterRaman))
	add := func(light, own, area float64) {
		out = append(out,
			line{light, light, math.Hypot(own, bpEm), area},
			line{light, 2 * light, math.Hypot(2*own, bpEm), area * in.SecondOrder})
	}
	add(ex, bpEx, elasticCoefficient(ex, turbidity))
	for _, p := range waterRaman {
		em := 1 / (1/ex - p.At/1e7)
		// d(em)/d(ex) = (em/ex)² at a fixed shift; d(em)/d(shift) = em²/10⁷
		stretch := em * em / (ex * ex)
		add(em, math.Hypot(bpEx*stretch, p.Width*em*em/1e7), ramanCoefficient(ex)*p.Height)
	}
	return out
}
