package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// ControlledDilution corrects the inner filter of e with a second measurement of
// the same water, diluted p times further than e, and no absorbance: with
// F = F₀·e^(−α) and F_p = (F₀/p)·e^(−α/p),
//
//	F₀ = (p·F_p)^(p/(p−1)) / F^(1/(p−1))
//
// (idea: Luciani et al. 2009, Chemom. Intell. Lab. Syst. 96, 227, from memory).
// The result stands for the liquid of e. factor, J × K, is F₀/F. Both EEMs must
// have the blank subtracted: the water's own scatter does not become less by
// dilution. Cells where either is not positive or missing become missing.
// Noise of equal relative size in both grows √(p²+1)/(p−1) times: 2.24 for p = 2.
// It panics when the grids or units differ or p ≤ 1.
func ControlledDilution(e, diluted *eem.EEM, p float64) (out *eem.EEM, factor []float64) {
	if !e.Grid.Equal(diluted.Grid) || e.Unit != diluted.Unit || !(p > 1) || math.IsInf(p, 0) {
		panic(fmt.Sprintf("correct: controlled dilution of %s in %s with %s in %s, %g-fold", e.Grid, e.Unit, diluted.Grid, diluted.Unit, p))
	}
	out, d := own(e), own(diluted)
	fix(out)
	fix(d)
	for _, c := range d.Causes { // give every cause a shape in both, 0 where it does not act
		if findCause(out.Causes, c) < 0 {
			out.Causes = append(out.Causes, eem.Cause{Name: c.Name, Scope: c.Scope, Key: c.Key, U: c.U, Shape: make([]float64, len(e.F))})
		}
	}
	factor = make([]float64, len(e.F))
	np, n := p/(p-1), 1/(p-1) // exponents of F_p and F
	lost := 0
	for i, f := range e.F {
		fp := d.F[i]
		factor[i] = math.NaN()
		if !(f > 0) || !(fp > 0) {
			if measured(e, i) {
				lost++
				out.Drop(i, eem.NoAbsorbance)
			}
			continue
		}
		f0 := math.Exp(np*math.Log(p*fp) - n*math.Log(f))
		factor[i], out.F[i] = f0/f, f0
		if out.Var != nil {
			out.Var[i] = f0 * f0 * n * n * e.Var[i] / (f * f)
			if d.Var != nil {
				out.Var[i] += f0 * f0 * np * np * d.Var[i] / (fp * fp)
			}
		}
		for c := range out.Causes {
			s := -n * out.Causes[c].Shape[i] / f
			if at := findCause(d.Causes, out.Causes[c]); at >= 0 {
				s += np * d.Causes[at].Shape[i] / fp
			}
			out.Causes[c].Shape[i] = f0 * s
		}
	}
	out.Note(record(StepInner, fmt.Sprintf("corrected by controlled dilution, %s-fold; %s left out: not positive in both", num(p), eem.Count(lost, "cell")),
		eem.Param{Name: "form", Value: "controlled dilution", Source: "settings: correct.inner_filter"},
		eem.Param{Name: "further dilution", Value: num(p), Source: "run sheet: dilution"}))
	return out, factor
}
