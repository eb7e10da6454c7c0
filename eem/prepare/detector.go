package prepare

import (
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// The names of [correct] off that [scans] applied does not have.
const (
	stepSaturation  = "saturation"
	stepDropped     = "dropped-scans"
	stepSpikes      = "spikes"
	stepTemperature = "temperature"
)

// off says whether the settings switch a step off.
func (b *Bottle) off(step string) bool { return slices.Contains(b.Setting.Correct.Off, step) }

// skips says whether a step is not done here: switched off, or done before the
// files came here.
func (b *Bottle) skips(step string) bool { return b.done(step) || b.off(step) }

// Undiluted is what an amount in the liquid scanned is multiplied by to be one in
// the liquid that the intensities speak of: the bottle's, unless the settings
// switch that step off.
func (b *Bottle) Undiluted() float64 {
	if b.off(stepDilution) {
		return 1
	}
	return b.Row.Dilution
}

// rawCounts says whether the files hold what the detector reported, but for factors
// common to all cells. Programs that subtract, mask or fill leave zeros and equal
// numbers that no detector gives.
func (b *Bottle) rawCounts() bool {
	return !b.done(stepSpectral) && !b.done(stepInner) && !b.done(stepBlank) && !b.done(stepScatter)
}

// faults looks for what detectors, people and files do to scans, and leaves out
// the cells that hold no light of the bottle's. dead is not empty when nothing of
// the scans can be used; its note is not among those of the EEM.
func (b *Bottle) faults(s *Survey, e *eem.EEM) (out *eem.EEM, dead []eem.Note) {
	if out = correct.Swapped(e); len(out.Notes) > len(e.Notes) {
		return e, out.Notes[len(e.Notes):]
	}
	if dark, why := b.noLight(e); dark {
		dead = append(dead, eem.Note{Test: "no-light", Severity: eem.Reject, Msg: why + "; look at lamp, shutter and cell, and measure again"})
		return e, dead
	}
	e = correct.ShortScans(e, s.Limit("scan-short"))
	switch limit := b.Setting.Scans.Saturation; {
	case b.off(stepSaturation):
	case limit > 0:
		e = correct.Saturate(e, limit)
	case b.rawCounts():
		e = correct.SaturateAuto(e)
	}
	s.tell(b, correct.StepSaturation, e)
	e = correct.RepeatedScans(e)
	if b.rawCounts() {
		if !b.off(stepDropped) {
			e = correct.DeadScans(e)
		}
		if !b.off(stepSpikes) {
			e = correct.Spikes(e, s.Limit("spike"), nearLines(b.Setting.Scatter))
		}
	}
	s.tell(b, correct.StepDetector, e)
	return e, nil
}

// nearLines says where light is as narrow as a spike: in the bands of the
// settings, and no nearer to the lines than the default ones.
func nearLines(set survey.Scatter) func(exNM, emNM float64) bool {
	return scatter.In(append(Bands(set), Bands(survey.Default().Scatter)...))
}
