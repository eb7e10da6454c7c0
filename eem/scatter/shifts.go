package scatter

import (
	"math"

	"tarnlight/eem"
)

// Shifts, cm⁻¹, of the outermost components of water's O–H stretch (seen in
// published Raman spectra of water: 3070, 3230, 3440, 3600 and 3650).
const (
	firstShift = 3070
	lastShift  = 3650
)

// AutoShifts gives a Raman line the band that its own ridges need, as AutoBand
// does, stretched over the shifts of water's O–H stretch: the line is so many
// cm⁻¹ wide and widens with the excitation, while what the slits add stays the
// same in nanometres. Below and Above are the ninth tenths over the excitations
// of what AutoBand's reach leaves beyond the stretch, rounded up to half
// nanometres. ok is false where fewer than three excitations show the line.
func AutoShifts(ps []Peak, l Line, why eem.Reason) (b Band, ok bool) {
	if _, ok := Offset(ps); !ok {
		return Band{}, false
	}
	snr := make([]float64, len(ps))
	for i, p := range ps {
		snr[i] = min(p.Snr, 1e6)
	}
	reach := max(1, math.Sqrt(math.Log2(median(snr)))/2)
	below, above := make([]float64, len(ps)), make([]float64, len(ps))
	for i, p := range ps {
		below[i] = Line{l.Order, firstShift}.Em(p.ExNM) - (p.Em - reach*p.Width)
		above[i] = p.Em + reach*p.Width - Line{l.Order, lastShift}.Em(p.ExNM)
	}
	up := func(v []float64) float64 { return max(0.5, math.Ceil(2*quantile(v, 0.9))/2) }
	return Band{Line: l, From: firstShift, To: lastShift, Below: up(below), Above: up(above), Reason: why}, true
}
