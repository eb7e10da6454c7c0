package prepare

import (
	"fmt"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// Windows, nm on both sides of a line, in which its ridge is looked for. Water's
// Raman line is 10 to 40 nm wide (Appl. Spectrosc. 2011, 65, 233), the Rayleigh
// line as wide as the slits; at ex 250 both are 23 nm apart.
const (
	ramanWindow    = 25
	rayleighWindow = 15
)

// blankMean is the mean of the bottle's blanks on the bottle's own grid, nil
// where it has none.
func (b *Bottle) blankMean() (*eem.EEM, error) {
	if len(b.blanks) == 0 {
		return nil, nil
	}
	es := make([]*eem.EEM, len(b.blanks))
	for i, blank := range b.blanks {
		es[i] = blank.raw.Regrid(b.raw.Grid)
	}
	return correct.Mean(es)
}

// checkLight holds the bottle's own Raman line against that of its blanks, before
// they are subtracted. Without an inner-filter correction brown water alone dims
// the line, so that only its absence counts then.
func (b *Bottle) checkLight(s *Survey, e, blank *eem.EEM) *eem.EEM {
	if b.Row.Kind == survey.Blank || !b.rawLight() {
		return e
	}
	limit := s.Limit("low-light")
	if b.dimmed() {
		limit = 1e-9
	}
	return scatter.CheckLight(e, blank, scatter.Raman1, ramanWindow, limit)
}

// dimmed says whether the liquid's own absorbance still takes part of the light.
func (b *Bottle) dimmed() bool {
	return b.needsAbsorbance() && (b.scanned == nil || b.skips(stepInner) && !b.done(stepInner) || b.Setting.Correct.InnerFilter == "none")
}

// rawLight says whether the files still hold the light of the scatter lines, on
// one scale with their blanks.
func (b *Bottle) rawLight() bool { return !b.done(stepBlank) && !b.done(stepScatter) }

// checkBlanks holds the ridges of every blank against the lines, and its Raman
// areas against their law over excitation.
func (bt *Batch) checkBlanks(s *Survey) {
	for _, b := range bt.Blanks {
		if !b.rawLight() {
			continue
		}
		e := scatter.CheckWavelength(b.EEM, scatter.Rayleigh1, rayleighWindow, s.Limit("wavelength"))
		e = scatter.CheckWavelength(e, scatter.Raman1, ramanWindow, s.Limit("wavelength"))
		if f := s.factors[b.Row.Setup]; b.done(stepSpectral) || f.ex != nil && !b.off(stepSpectral) {
			exponent := map[string]float64{"photons": correct.RamanPhotons, "energy": correct.RamanEnergy}[b.Setting.Correct.SpectralUnits]
			e = correct.CheckRamanLaw(e, b.Setting.Intensity.ExcitationNM, exponent, s.Limit("raman-law"))
		}
		b.EEM, b.raw = e, e
		b.flagNotes(s, e)
	}
}

// inherit hands the doubts of blanks to every bottle that used them, one flag for
// all blanks that share a doubt.
func (s *Survey) inherit() {
	for _, b := range s.Bottles {
		if b.Excluded || b.Row.Kind == survey.Blank {
			continue
		}
		var told []string
		for _, blank := range b.blanks {
			for _, f := range blank.Flags {
				if f.Severity < eem.Doubt || slices.Contains(told, f.Test) {
					continue
				}
				told = append(told, f.Test)
				f.ID, f.Batch, f.Severity = b.Row.ID, b.Batch, eem.Doubt
				f.Msg = fmt.Sprintf("blank %s, used here: %s", strings.Join(sharing(b.blanks, f.Test), ", "), f.Msg)
				b.Flags = append(b.Flags, f)
			}
		}
	}
}

// sharing lists the ids of the blanks that have a doubt of this code.
func sharing(blanks []*Bottle, test string) []string {
	var ids []string
	for _, b := range blanks {
		if slices.ContainsFunc(b.Flags, func(f eem.Flag) bool { return f.Test == test && f.Severity >= eem.Doubt }) {
			ids = append(ids, b.Row.ID)
		}
	}
	return ids
}
