package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// InnerFilter multiplies every cell by the geometry's factor at the absorbance a
// of the scanned liquid. factor, J × K, holds what each cell was multiplied by,
// NaN where there is none. Cells outside the absorbance spectrum become missing
// (NoAbsorbance). Cells whose total absorbance (excitation + emission, over the
// path of the measuring cell) exceeds limit keep their corrected value and are
// flagged with the dilution that would bring the bottle back; limit 0 means the
// default of the test absorbance-limit. Without absorbance (nil) nothing is
// multiplied, every factor is NaN and the bottle is flagged. It panics where
// g.Check fails.
func InnerFilter(e *eem.EEM, a *eem.Absorbance, g Geometry, limit float64) (out *eem.EEM, factor []float64) {
	if err := g.Check(); err != nil {
		panic("correct: " + err.Error())
	}
	factor = make([]float64, len(e.F))
	for i := range factor {
		factor[i] = math.NaN()
	}
	out = own(e)
	if a == nil {
		n := finding(StepInner, "no-absorbance", 0, 0, "no absorbance is given, so that the inner filter was not corrected: results are low where the water absorbs, and high where standards lack it too; name an absorbance file, or say in [scans] applied that the files come corrected")
		n.Measure = false
		out.Note(n)
		return out, factor
	}
	limit = defaultLimit("absorbance-limit", limit)
	ax, am := perCM(a, e.Ex), perCM(a, e.Em)
	lost, largest := 0, 1.0
	for i, f := range g.Factors(ax, am) {
		here := measured(e, i)
		if math.IsNaN(f) {
			if here {
				lost++
				out.Drop(i, eem.NoAbsorbance)
			}
			continue
		}
		if math.IsInf(f, 0) { // an absorbance above 600, flagged below
			if here {
				out.Drop(i, eem.OverAbsorbing)
			}
			continue
		}
		factor[i] = f
		times(out, i, f)
		if here {
			largest = max(largest, f)
		}
	}
	out.Note(record(StepInner, "multiplied by the factor of each cell, largest "+num(largest), g.params(largest, limit)...))
	if lost > 0 {
		out.Note(finding(StepInner, "absorbance-range", float64(lost), 0, fmt.Sprintf(
			"%s left out: outside the absorbance spectrum (%s); measure the absorbance over ex %s and em %s",
			eem.Count(lost, "cell"), stretch(a.Axis), stretch(e.Ex), stretch(e.Em))))
	}
	noteOver(out, overAbsorbing(e, ax, am, g.path(), limit), limit)
	noteNegative(out, a)
	return out, factor
}

// DropOverAbsorbing makes cells whose total absorbance exceeds limit missing
// (OverAbsorbing), for standards: a correction beyond its range must not enter a
// reference. limit 0 means the default of the test absorbance-limit.
func DropOverAbsorbing(e *eem.EEM, a *eem.Absorbance, g Geometry, limit float64) *eem.EEM {
	out := e.Clone()
	if a == nil {
		return out
	}
	limit = defaultLimit("absorbance-limit", limit)
	o := overAbsorbing(e, perCM(a, e.Ex), perCM(a, e.Em), g.path(), limit)
	for _, i := range o.cells {
		out.Drop(i, eem.OverAbsorbing)
	}
	out.Note(record(StepInner, fmt.Sprintf("%s with a total absorbance above %s left out", eem.Count(len(o.cells), "cell"), num(limit)),
		eem.Param{Name: "absorbance limit", Value: num(limit), Source: "settings: correct.absorbance_limit"}))
	return out
}

// stretch is what an axis covers, for a message.
func stretch(a eem.Axis) string { return eem.NM(a.First()) + "–" + eem.NM(a.Last()) + " nm" }

// perCM gives the absorbance of 1 cm on an axis, NaN where it was not measured.
func perCM(a *eem.Absorbance, ax eem.Axis) []float64 {
	v := make([]float64, ax.Len())
	for i := range v {
		v[i] = a.PerCM(ax.At(i))
	}
	return v
}

// over tells which measured cells exceed the limit and where the worst is.
type over struct {
	cells  []int
	total  float64 // the largest total absorbance
	ex, em float64 // nm, where it is
}

// overAbsorbing looks at measured cells at or above the Rayleigh line; below it
// nothing fluoresces, and a strong absorbance there harms no result.
func overAbsorbing(e *eem.EEM, ax, am []float64, path, limit float64) over {
	var o over
	for j := range ax {
		for k := range am {
			i, total := e.Index(j, k), (ax[j]+am[k])*path
			if e.Em.At(k) < e.Ex.At(j) || !(total > limit) || !measured(e, i) {
				continue
			}
			o.cells = append(o.cells, i)
			if total > o.total {
				o.total, o.ex, o.em = total, e.Ex.At(j), e.Em.At(k)
			}
		}
	}
	return o
}

// OverShare is the share of the measured cells at or above the Rayleigh line whose
// total absorbance exceeds limit (0: the default of the test absorbance-limit), so
// that their correction is beyond its range; NaN without absorbance or cells.
func OverShare(e *eem.EEM, a *eem.Absorbance, g Geometry, limit float64) float64 {
	if a == nil {
		return math.NaN()
	}
	n := 0
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			if e.Em.At(k) >= e.Ex.At(j) && measured(e, e.Index(j, k)) {
				n++
			}
		}
	}
	o := overAbsorbing(e, perCM(a, e.Ex), perCM(a, e.Em), g.path(), defaultLimit("absorbance-limit", limit))
	return float64(len(o.cells)) / float64(n)
}

// noteOver flags the bottle with the dilution that would bring it back: the
// absorbance of the scanned liquid falls as 1 over the dilution.
func noteOver(e *eem.EEM, o over, limit float64) {
	if len(o.cells) == 0 {
		return
	}
	e.Note(finding(StepInner, "absorbance-limit", o.total, limit, fmt.Sprintf(
		"total absorbance reaches %.3g at %s, %s above the limit of %s; dilute the scanned liquid at least %.2g-fold and measure again",
		o.total, eem.Spot(o.ex, o.em), eem.Count(len(o.cells), "cell"), num(limit), math.Ceil(10*o.total/limit)/10)))
}

// noteNegative flags an absorbance spectrum that falls well below zero where the
// EEM lies: its baseline is off, and so is the correction.
func noteNegative(e *eem.EEM, a *eem.Absorbance) {
	limit := defaultLimit("absorbance-negative", 0)
	lowest, at := 0.0, 0.0
	for _, ax := range []eem.Axis{e.Ex, e.Em} {
		for i := range ax.Len() {
			if v := a.PerCM(ax.At(i)); v < lowest {
				lowest, at = v, ax.At(i)
			}
		}
	}
	if lowest < -limit {
		e.Note(finding(StepInner, "absorbance-negative", lowest, -limit, fmt.Sprintf(
			"the absorbance falls to %s per cm at %s nm; measure its baseline again, with pure water in the cell", num(lowest), eem.NM(at))))
	}
}

// params describes the geometry in a note.
func (g Geometry) params(largest, limit float64) []eem.Param {
	form := g.Form
	if form == "" {
		form = RightAngle
	}
	ex, em := g.stretch(g.Ex), g.stretch(g.Em)
	p := []eem.Param{
		{Name: "form", Value: form, Source: "settings: correct.inner_filter"},
		{Name: "viewed along excitation", Value: fmt.Sprintf("%g–%g", ex[0], ex[1]), Unit: "cm", Source: "settings"},
	}
	if form == RightAngle {
		p = append(p, eem.Param{Name: "viewed along emission", Value: fmt.Sprintf("%g–%g", em[0], em[1]), Unit: "cm", Source: "settings"})
	}
	if form != RightAngle {
		p = append(p, eem.Param{Name: "angle of incidence, in air", Value: num(g.InDeg), Unit: "°", Source: "settings: correct.incidence_deg"},
			eem.Param{Name: "angle of observation, in air", Value: num(g.OutDeg), Unit: "°", Source: "settings: correct.observation_deg"})
	}
	return append(p,
		eem.Param{Name: "cell path", Value: num(g.path()), Unit: "cm", Source: "settings: correct.cell_cm"},
		eem.Param{Name: "absorbance limit", Value: num(limit), Source: "settings: correct.absorbance_limit"},
		eem.Param{Name: "largest factor", Value: num(largest), Source: "absorbance"})
}
