// Package scatter knows where the solvent's scatter lines fall in an EEM, makes
// the cells they cover missing, fills the gaps on request, and measures the
// ridges to check wavelengths and band widths.
package scatter

import (
	"math"
	"strconv"

	"tarnlight/eem"
)

// Step is the name of this step in the notes.
const Step = "scatter"

// WaterShift is the Raman shift, cm⁻¹, taken for liquid water. Its O–H stretch is
// a broad band made of components near 3070, 3230, 3440, 3600 and 3650, so that
// any one number is a convention; 3382 and 3400 are both in use and differ by
// 0.3 nm at ex 350. 3400 is the line for which the scattering coefficient and its
// wavelength law were measured (Bartlett et al. 1998, Appl. Opt. 37, 3324),
// against which this package's ridges are held.
const WaterShift = 3400

// Line is a scatter line: the light of a given order, shifted by Shift cm⁻¹
// (0 for Rayleigh).
type Line struct {
	Order int
	Shift float64 // cm⁻¹
}

// The four lines of water.
var (
	Rayleigh1 = Line{Order: 1}
	Rayleigh2 = Line{Order: 2}
	Raman1    = Line{Order: 1, Shift: WaterShift}
	Raman2    = Line{Order: 2, Shift: WaterShift}
)

// Em returns the emission wavelength, nm, of the line excited at ex nm:
//
//	λ_em = order / (1/λ_ex − Δν̃)
//
// +Inf where the shift takes all the energy. Wavelengths in air are used as they
// are; the correction to vacuum is under 0.05 nm.
func (l Line) Em(ex float64) float64 {
	if l.Shift == 0 {
		return float64(l.Order) * ex // without the rounding of two reciprocals
	}
	const nmPerCM = 1e7
	d := 1/ex - l.Shift/nmPerCM
	if d <= 0 {
		return math.Inf(1)
	}
	return float64(l.Order) / d
}

// Band is what is removed around a line.
type Band struct {
	Line
	Below, Above float64 // nm on the short and on the long side of the line
	// From and To, cm⁻¹, when To is set, stretch the band over a range of Raman
	// shifts, so that it widens with the excitation as the line itself does:
	// Below is taken from the shift From and Above from To.
	From, To float64
	Reason   eem.Reason
}

// Range returns the band's ends, nm, both part of it, at ex nm.
func (b Band) Range(ex float64) (lo, hi float64) {
	if b.To > 0 {
		return Line{b.Order, b.From}.Em(ex) - b.Below, Line{b.Order, b.To}.Em(ex) + b.Above
	}
	em := b.Em(ex)
	return em - b.Below, em + b.Above
}

func num(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }
