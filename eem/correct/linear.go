package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// Linearity tells, for one excitation, how far emission is from proportional to
// concentration when nothing is corrected. Light absorbed over the path is
// 1 − e^(−x), x = ln(10)·A; the linear form takes it as x.
type Linearity struct {
	ExNM   float64
	X      float64 // ln(10)·A over the path (natural base), NaN where the absorbance is not known
	Excess float64 // by which fraction the linear form is too high: x/(1 − e^−x) − 1
}

// Linear returns the linearity at every excitation of ex for a liquid of
// absorbance a in a cell of pathCM. "Below 0.05" in textbooks is meant for x
// (2.5 % too high at 0.05), not for A (5.9 %).
func Linear(ex eem.Axis, a *eem.Absorbance, pathCM float64) []Linearity {
	out := make([]Linearity, ex.Len())
	for j := range out {
		nm := ex.At(j)
		x := math.Ln10 * a.PerCM(nm) * pathCM
		out[j] = Linearity{ExNM: nm, X: x, Excess: excess(x)}
	}
	return out
}

// excess is x/(1 − e^−x) − 1.
func excess(x float64) float64 {
	if x == 0 {
		return 0
	}
	return -x/math.Expm1(-x) - 1
}

// LinearRange appends what Linear finds as a note (linear-range) when any
// excitation of e is above limit; limit 0 means the default of the test, 0.05.
func LinearRange(e *eem.EEM, a *eem.Absorbance, pathCM, limit float64) *eem.EEM {
	out := e.Clone()
	if a == nil {
		return out
	}
	limit = defaultLimit("linear-range", limit)
	var worst, longest Linearity
	above := 0
	for _, l := range Linear(e.Ex, a, pathCM) {
		if !(l.X > limit) {
			continue
		}
		above++
		longest = l
		if l.X > worst.X {
			worst = l
		}
	}
	if above > 0 {
		out.Note(finding(StepInner, "linear-range", worst.X, limit, fmt.Sprintf(
			"ln(10)·A is above %s at %d of %d excitations, up to ex %s nm; largest %.3g at ex %s nm, where emission taken as proportional without correction would be off by %.1f %%",
			num(limit), above, e.Ex.Len(), eem.NM(longest.ExNM), worst.X, eem.NM(worst.ExNM), 100*worst.Excess)))
	}
	return out
}
