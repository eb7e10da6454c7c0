package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// Saturate makes cells at or above limit, counts as the detector reports them
// (before the offset is subtracted), missing. It leaves e as it is when limit is
// not positive: no limit was stated.
func Saturate(e *eem.EEM, limit float64) *eem.EEM {
	out := e.Clone()
	if !(limit > 0) {
		return out
	}
	n := 0
	for i, v := range out.F {
		if v >= limit {
			out.Drop(i, eem.Saturated)
			n++
		}
	}
	out.Note(record(StepSaturation, fmt.Sprintf("%s at or above %s counts left out", eem.Count(n, "cell"), num(limit)),
		eem.Param{Name: "saturation", Value: num(limit), Unit: "counts", Source: "settings: scans.saturation"}))
	if n > 0 {
		out.Note(finding(StepSaturation, "saturated", float64(n), 0, fmt.Sprintf(
			"%s left out: at or above the detector's limit of %s counts; dilute the bottle or narrow the slits and scan again", eem.Count(n, "cell"), num(limit))))
	}
	return out
}

// Offset subtracts the detector's dark level, counts, from every cell.
func Offset(e *eem.EEM, counts float64) *eem.EEM {
	out := own(e)
	fix(out)
	for i := range out.F {
		out.F[i] -= counts
		dropInf(out, i)
	}
	out.Note(record(StepOffset, num(counts)+" counts subtracted from every cell",
		eem.Param{Name: "offset", Value: num(counts), Unit: "counts", Source: "settings: scans.offset"}))
	return out
}

const (
	// darkMargin is how far, nm, below the excitation the dark region starts: a
	// wide slit's Rayleigh line reaches 20 nm (METHODS 3, typical half-widths
	// 10–20 nm).
	darkMargin = 30
	// darkCells is the fewest cells that tell a level: the median of 20 normal
	// values has a standard error of 0.28 standard deviations.
	darkCells = 20
)

// OffsetAuto returns the dark level, counts: the median of the measured cells
// that lie 30 nm and more below the excitation, where neither fluorescence nor
// Rayleigh light falls. Cells within 30 nm of half the excitation wavelength,
// which a grating's second order can light, are left out too. ok is false where fewer
// than 20 such cells were scanned.
func OffsetAuto(e *eem.EEM) (counts float64, ok bool) {
	var dark []float64
	for j := range e.Ex.Len() {
		ex := e.Ex.At(j)
		for k, v := range e.Row(j) {
			em := e.Em.At(k)
			if em < ex-darkMargin && math.Abs(em-ex/2) > darkMargin && measured(e, e.Index(j, k)) {
				dark = append(dark, v)
			}
		}
	}
	if len(dark) < darkCells {
		return 0, false
	}
	return median(dark), true
}
