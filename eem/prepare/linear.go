package prepare

import (
	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// linearRange states for every excitation whether the liquid scanned is thin
// enough for emission to be proportional to concentration by itself. Where the
// inner filter is corrected that is a record, where it is not a finding.
func (b *Bottle) linearRange(s *Survey, e *eem.EEM) *eem.EEM {
	if b.scanned == nil || b.done(stepInner) || b.Row.Kind == survey.Blank {
		return e
	}
	pathCM := b.Setting.Correct.CellCM
	limit := s.Limit("linear-range")
	for _, l := range correct.Linear(e.Ex, b.scanned, pathCM) {
		switch {
		case !(l.X <= limit):
			b.LinearFrom = nan
		case b.LinearFrom != b.LinearFrom:
			b.LinearFrom = l.ExNM
		}
	}
	out := correct.LinearRange(e, b.scanned, pathCM, limit)
	if b.off(stepInner) || b.Setting.Correct.InnerFilter == "none" {
		return out
	}
	for i := len(e.Notes); i < len(out.Notes); i++ {
		out.Notes[i].Test, out.Notes[i].Severity = "", eem.Information
	}
	return out
}
