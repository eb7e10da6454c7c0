package prepare

import (
	"fmt"
	"math"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// lessBlank subtracts the mean of the bottle's blanks.
func (b *Bottle) lessBlank() (*eem.EEM, error) {
	mean, err := b.blankMean()
	if mean == nil || err != nil {
		return b.raw, err
	}
	return correct.Blank(b.raw, mean), nil
}

// removeBlank holds the bottle against its blanks and subtracts their mean.
func (b *Bottle) removeBlank(s *Survey, e *eem.EEM) *eem.EEM {
	mean, err := b.blankMean()
	switch {
	case err != nil:
		b.reject(s, "no-blank", err.Error())
		return e
	case mean != nil:
		e = b.checkLight(s, e, mean)
	}
	if b.skips(stepBlank) || b.Setting.Correct.Blank == "none" {
		return e
	}
	if mean == nil {
		if b.Rejected { // it was given none
			return e
		}
		b.flag(s, eem.Note{Test: "no-blank", Severity: eem.Doubt, Msg: b.noBlank()})
		return e
	}
	return correct.Blank(e, mean)
}

// noBlank says why nothing was subtracted.
func (b *Bottle) noBlank() string {
	if b.Setting.Correct.Blank == "latest" {
		return fmt.Sprintf("no usable blank of this setup was measured in the %g days before, so that none was subtracted; add one, name one in the blanks column, or say in [scans] applied that the files come corrected", b.Setting.Correct.BlankMaxAgeDays)
	}
	return fmt.Sprintf("batch %s has no usable blank, so that none was subtracted; add one, name one in the blanks column, or say in [scans] applied that the files come corrected", b.Batch)
}

// finish does the steps that need the batch: blank, temperature, scale, dilution,
// scatter.
func (b *Bottle) finish(s *Survey) {
	if b.EEM == nil {
		return
	}
	if set := b.Setting.Correct; b.Largest == b.Largest { // corrected here
		b.OverShare = correct.OverShare(b.EEM, b.scanned, geometry(set), set.AbsorbanceLimit)
	}
	e := b.removeBlank(s, b.EEM)
	s.tell(b, correct.StepBlank, e)
	e = b.byDilution(s, b.withNoise(e))
	e = b.toReference(s, e)
	s.tell(b, correct.StepTemperature, e)
	e = b.scaleTo(s, e)
	s.tell(b, correct.StepScale, e)
	if !b.skips(stepDilution) && b.Row.Dilution != 1 {
		e = correct.Dilute(e, b.Row.Dilution)
	}
	s.tell(b, correct.StepDilution, e)
	if !b.skips(stepScatter) {
		e = scatter.Mask(e, Bands(b.Setting.Scatter))
		s.sourceOfBands(e)
		if len(b.blanks) > 0 && b.Row.Kind != survey.Blank {
			e = b.checkNegative(s, e) // what is left of the lines tells nothing
		}
		e = scatter.Fill(e, b.Setting.Scatter.Fill)
	}
	s.tell(b, scatter.Step, e)
	for _, step := range b.Setting.Scans.Applied {
		e.Note(eem.Note{Step: stepNames[step], Msg: "done to the files before they came here; not done again",
			Params: []eem.Param{{Name: "applied", Value: "before", Source: "settings: scans.applied"}}})
	}
	for _, step := range b.Setting.Correct.Off {
		e.Note(eem.Note{Step: stepNames[step], Msg: step + " switched off",
			Params: []eem.Param{{Name: step, Value: "off", Source: "settings: correct.off"}}})
	}
	e = b.takeNoise(e)
	b.EEM = e
	b.flagNotes(s, e)
}

// checkNegative holds the cells against the noise of bottle and blanks together; in
// the dark, where it matters, a blank is as noisy as the bottle.
func (b *Bottle) checkNegative(s *Survey, e *eem.EEM) *eem.EEM {
	both := *e
	if e.Var != nil {
		both.Var = make([]float64, len(e.Var))
		for i, v := range e.Var {
			both.Var[i] = v * (1 + 1/float64(len(b.blanks)))
		}
	}
	out := correct.Negative(&both, s.Limit("negative"))
	out.Var = e.Var
	return out
}

// toReference brings the bottle to the reference temperature of the settings.
func (b *Bottle) toReference(s *Survey, e *eem.EEM) *eem.EEM {
	t := b.Setting.Correct.Temperature
	if !t.On || b.off(stepTemperature) || b.Row.Kind == survey.Blank {
		return e
	}
	rho := -t.PercentPerC / 100
	var msg string
	switch c := b.Row.TemperatureC; {
	case math.IsNaN(c):
		msg = "temperature_c is empty, so that the bottle was not brought to the reference temperature; fill it in"
	case !(1+rho*(c-t.ReferenceC) > 0):
		msg = fmt.Sprintf("at %g °C a loss of %g %% per °C leaves nothing; correct the cell temperature_c or the setting correct.temperature", c, t.PercentPerC)
	default:
		return correct.Temperature(e, c, t.ReferenceC, rho)
	}
	b.flag(s, eem.Note{Test: "no-temperature", Severity: eem.Doubt, Msg: msg})
	return e
}

// scaleTo brings the intensities to the survey's unit.
func (b *Bottle) scaleTo(s *Survey, e *eem.EEM) *eem.EEM {
	bt := s.Find(b.Batch)
	if b.done(stepIntensity) {
		out := e.Clone()
		out.Unit = s.Unit
		return out
	}
	switch s.Unit {
	case eem.Raman:
		r, err := b.raman(bt)
		if err == nil && !(r.Area > 0) {
			err = fmt.Errorf("no blank gives batch %s a Raman area, without which it cannot be given in Raman units: %s; name a blank in the blanks column", b.Batch, bt.Reason)
		}
		if err != nil {
			b.reject(s, "raman-range", err.Error())
			return e
		}
		b.scale = r.Area
		return correct.RamanUnits(e, r, b.Batch)
	case eem.Quinine:
		if !(bt.Quinine.Slope > 0) {
			b.reject(s, "counts", fmt.Sprintf("batch %s has no line of quinine standards to take the intensity scale from", b.Batch))
			return e
		}
		b.scale = bt.Quinine.Slope
		return correct.QuinineUnits(e, bt.Quinine, b.Batch)
	}
	return e
}

// raman returns the Raman area over the very blanks that the bottle uses.
func (b *Bottle) raman(bt *Batch) (correct.RamanArea, error) {
	same := len(b.blanks) == len(bt.Blanks)
	for i := range b.blanks {
		same = same && b.blanks[i] == bt.Blanks[i]
	}
	if same || len(b.blanks) == 0 {
		return bt.Raman, nil
	}
	es := make([]*eem.EEM, len(b.blanks))
	for i, blank := range b.blanks {
		es[i] = blank.raw
	}
	set := b.Setting.Intensity
	r, err := correct.Areas(es, set.ExcitationNM, set.WindowNM, set.Baseline)
	r.From = fromOf(b.blanks, b.Batch)
	return r, err
}
