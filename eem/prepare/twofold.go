package prepare

import (
	"fmt"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// sameWater returns the row that measured a bottle's water at another dilution, by
// replicate_of either way, when neither has an absorbance; nil where there is none.
func (s *Survey) sameWater(b *Bottle) *Bottle {
	fits := func(o *Bottle) bool {
		return o != nil && o != b && !o.Excluded && o.Row.Absorbance == "" && o.Row.Setup == b.Row.Setup && o.Row.Dilution != b.Row.Dilution &&
			o.Row.ReplicateKind != survey.Field && b.Row.ReplicateKind != survey.Field
	}
	if b.Row.Absorbance != "" || b.skips(stepInner) || b.Setting.Correct.InnerFilter == "none" ||
		b.skips(stepBlank) || b.Setting.Correct.Blank == "none" { // water's own scatter does not thin out
		return nil
	}
	if of := s.bottle(b.Row.ReplicateOf); fits(of) {
		return of
	}
	for _, o := range s.Bottles {
		if o.Row.ReplicateOf == b.Row.ID && fits(o) {
			return o
		}
	}
	return nil
}

// pairDilutions says which bottles are corrected by a second dilution of their
// water, while none of them is changed.
func (s *Survey) pairDilutions() {
	for _, b := range s.Bottles {
		if b.twofold == nil || !b.Usable() {
			continue
		}
		if o := b.twofold; !o.Usable() || o.raw == nil {
			b.twofold = nil
			b.flag(s, eem.Note{Test: "no-absorbance", Severity: eem.Doubt,
				Msg: fmt.Sprintf("no absorbance is given and %q, the same water at another dilution, cannot be used; the inner filter was not corrected", o.Row.ID)})
		}
	}
}

// byDilution corrects the inner filter of e, blank subtracted, with the second
// measurement of its water: a bottle without absorbance that was scanned at two
// dilutions. The one diluted further gets what the pair tells, diluted.
func (b *Bottle) byDilution(s *Survey, e *eem.EEM) *eem.EEM {
	o := b.twofold
	if o == nil {
		return e
	}
	other, err := o.lessBlank()
	if err != nil {
		b.reject(s, "no-blank", err.Error())
		return e
	}
	if o.noise != nil {
		v := *other
		v.Var = make([]float64, len(v.F))
		for i := range v.Var {
			v.Var[i] = o.variance(i)
		}
		other = &v
	}
	other = other.Regrid(e.Grid)
	var out *eem.EEM
	p := o.Row.Dilution / b.Row.Dilution
	if p > 1 {
		var factor []float64
		out, factor = correct.ControlledDilution(e, other, p)
		b.Largest = largest(factor)
	} else {
		out, _ = correct.ControlledDilution(other, e, 1/p)
		out = correct.Scale(out, p, e.Unit, out.Notes[len(out.Notes)-1])
	}
	own := slices.Concat(e.Notes, out.Notes[len(out.Notes)-1:])
	own[len(own)-1].Params = append(own[len(own)-1].Params, eem.Param{Name: "with", Value: o.Row.ID, Source: "run sheet: replicate_of"})
	out.Notes = own
	return out
}
