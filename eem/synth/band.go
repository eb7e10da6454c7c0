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

func (b Band) on(a eem.Axis) []float64 {
	v := make([]float64, a.Len())
	for i := range v {
		v[i] = b.At(a.At(i))
	}
	return v
}
