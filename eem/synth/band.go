package synth

import (
	"math"

	"tarnlight/eem"
)

// Peak is a Gaussian in energy.
type Peak struct {
	At     float64 // wavenumber of the maximum, cm⁻¹
	Width  float64 // standard deviation, cm⁻¹
	Height float64
}

// PeakAt is a Peak whose place is given as a wavelength, nm.
func PeakAt(nm, width, height float64) Peak { return Peak{At: 1e7 / nm, Width: width, Height: height} }

// Band is a spectrum: a sum of Gaussians in energy, where the bands of
// molecules are nearly symmetric.
type Band []Peak

// At returns the height at nm.
func (b Band) At(nm float64) float64 {
	sum := 0.0
	for _, p := range b {
		z := (1e7/nm - p.At) / p.Width
		sum += p.Height * math.Exp(-z*z/2)
	}
	return sum
}

// Area returns the integral over wavelength, nm. With ν normally distributed,
//
//	∫ exp(−(ν−p)²/2w²) dλ = 10⁷·w·√(2π)·E[ν⁻²],  E[ν⁻²] = p⁻²·(1 + 3r² + 15r⁴ + 105r⁶ + …), r = w/p
//
// which is right to 10⁻⁵ for r ≤ 0.1.
func (b Band) Area() float64 {
	sum := 0.0
	for _, p := range b {
		r := p.Width / p.At * p.Width / p.At
		sum += p.Height * 1e7 * p.Width * math.Sqrt(2*math.Pi) / (p.At * p.At) * (1 + r*(3+r*(15+r*105)))
	}
	return sum
}

func (b Band) on(a eem.Axis) []float64 {
	v := make([]float64, a.Len())
	for i := range v {
		v[i] = b.At(a.At(i))
	}
	return v
}

// Tail is absorption that falls exponentially with wavelength, as that of
// dissolved natural matter does (Helms et al. 2008, Limnol.
// Oceanogr. 53, 955):
//
//	A(λ) = At254·exp(−Slope·(λ − 254 nm))
type Tail struct {
	At254 float64 // decadic, cm⁻¹
	Slope float64 // nm⁻¹
}

// At returns the absorption at nm.
func (t Tail) At(nm float64) float64 {
	if t.At254 == 0 {
		return 0
	}
	return t.At254 * math.Exp(-t.Slope*(nm-254))
}
