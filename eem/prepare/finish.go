package prepare

import (
	"fmt"
	"math"
	"path/filepath"
	"sort"

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

// chooseGrid takes the given grid, the stated one or that of the most samples, and
// says who lacks what.
func (s *Survey) chooseGrid(given *eem.Grid) error {
	type vote struct {
		grid  eem.Grid
		n     int
		first int
	}
	var votes []vote
	count := func(pass func(*Bottle) bool) {
		for i, b := range s.Bottles {
			if !b.Usable() || !pass(b) {
				continue
			}
			at := -1
			for v := range votes {
				if votes[v].grid.Equal(b.EEM.Grid) {
					at = v
				}
			}
			if at < 0 {
				at = len(votes)
				votes = append(votes, vote{grid: b.EEM.Grid, first: i})
			}
			votes[at].n++
		}
	}
	count(func(b *Bottle) bool { return b.Row.Kind == survey.Sample })
	if len(votes) == 0 {
		count(func(*Bottle) bool { return true })
	}
	if len(votes) == 0 {
		return s.nothingLeft()
	}
	sort.SliceStable(votes, func(a, b int) bool { return votes[a].n > votes[b].n })
	s.Grid = votes[0].grid
	if given != nil {
		s.Grid = *given
	}
	for _, a := range []struct {
		want *survey.Range
		axis *eem.Axis
		key  string
	}{{s.Settings.Grid.Excitation, &s.Grid.Ex, "excitation"}, {s.Settings.Grid.Emission, &s.Grid.Em, "emission"}} {
		if a.want != nil && given == nil {
			ax, err := eem.Steps(a.want.From, a.want.To, a.want.Step)
			if err != nil {
				return fmt.Errorf("settings, grid.%s: %w", a.key, err)
			}
			*a.axis = ax
		}
	}
	for _, b := range s.Bottles {
		if b.Usable() {
			s.compareGrid(b)
		}
	}
	return nil
}

// nothingLeft tells the first reasons why no bottle can be used.
func (s *Survey) nothingLeft() error {
	msg := ""
	n := 0
	for _, b := range s.Bottles {
		for _, f := range b.Flags {
			if f.Severity == eem.Reject {
				if n++; n <= 5 {
					msg += fmt.Sprintf("\n  %s: %s", b.Row.ID, f.Msg)
				}
				break
			}
		}
	}
	if n > 5 {
		msg += fmt.Sprintf("\n  and %d more", n-5)
	}
	return fmt.Errorf("%s: not one bottle can be used:%s", s.Sheet.Path, msg)
}

// compareGrid notes what a bottle lacks of the survey's grid.
func (s *Survey) compareGrid(b *Bottle) {
	if b.EEM.Grid.Equal(s.Grid) {
		return
	}
	var lackEx, lackEm, off int
	for j := range s.Grid.Ex.Len() {
		if nm := s.Grid.Ex.At(j); !tells(b.EEM.Ex, nm) {
			lackEx++
		} else if _, ok := b.EEM.Ex.Find(nm); !ok {
			off++
		}
	}
	for k := range s.Grid.Em.Len() {
		if nm := s.Grid.Em.At(k); !b.EEM.Em.Covers(nm) || !b.EEM.Em.Bridged(nm) {
			lackEm++
		} else if _, ok := b.EEM.Em.Find(nm); !ok {
			off++
		}
	}
	nj, nk := s.Grid.Ex.Len(), s.Grid.Em.Len()
	if lack := nj*nk - (nj-lackEx)*(nk-lackEm); lack > 0 {
		b.flag(s, eem.Note{Test: "grid-part", Severity: eem.Remark, Measure: true, Value: float64(lack), Limit: 0,
			Msg: fmt.Sprintf("measured on %s; lacks %d of %d excitations and %d of %d emissions of the survey's grid (%s)", b.EEM.Grid, lackEx, nj, lackEm, nk, s.Grid)})
	}
	if off > 0 {
		b.flag(s, eem.Note{Test: "grid-differs", Severity: eem.Remark,
			Msg: fmt.Sprintf("measured on %s; interpolated linearly onto the survey's grid (%s)", b.EEM.Grid, s.Grid)})
	}
}

// Verdict says in one word what a batch is worth by its reading, and why; what
// checkBatches found on it as a whole is not among the reasons.
func (bt *Batch) Verdict() (verdict string, reasons []string) {
	verdict = "good"
	if bt.lacksScale() {
		verdict, reasons = "doubt", append(reasons, "no intensity scale: "+bt.Reason)
	}
	if n := bt.rejected(); n > 0 {
		reasons = append(reasons, fmt.Sprintf("%d of %s rejected", n, eem.Count(len(bt.Bottles), "bottle")))
	}
	for _, b := range bt.Blanks {
		for _, f := range b.Flags {
			if f.Severity >= eem.Doubt {
				verdict, reasons = "doubt", append(reasons, "blank "+b.Row.ID+": "+f.Msg)
			}
		}
	}
	return verdict, reasons
}

// rejected counts the batch's bottles of which nothing can be used.
func (bt *Batch) rejected() int {
	n := 0
	for _, b := range bt.Bottles {
		if b.Rejected {
			n++
		}
	}
	return n
}

// lacksScale says whether the batch should have got an intensity scale and did not.
func (bt *Batch) lacksScale() bool {
	first := bt.Bottles[0]
	return bt.Reason != "" && bt.Unit == eem.Counts && first.Setting.Intensity.Unit != "counts" && !first.skips(stepIntensity)
}

// checkBelow tells, once for the survey, of cells that no scatter step cut out
// although nothing fluoresces there.
func (s *Survey) checkBelow() {
	bottles, most := 0, 0
	var first string
	for _, b := range s.Bottles {
		if !b.Usable() || b.Row.Kind != survey.Sample || !b.skips(stepScatter) {
			continue
		}
		n := 0
		for j := range b.EEM.Ex.Len() {
			for k := 0; k < b.EEM.Em.Len() && b.EEM.Em.At(k) < b.EEM.Ex.At(j); k++ {
				if b.EEM.Why[b.EEM.Index(j, k)] == eem.Measured {
					n++
				}
			}
		}
		if n > 0 {
			if bottles++; bottles == 1 {
				first = b.Row.ID
			}
			most = max(most, n)
		}
	}
	if bottles > 0 {
		s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "below-excitation", Severity: eem.Remark, Measure: true, Value: float64(most),
			Msg: fmt.Sprintf("up to %s with an emission shorter than the excitation, where nothing fluoresces, count as measured in %s (%s, for example), because the settings say that scatter is taken out or is to stay; leave \"scatter\" out of [scans] applied and [correct] off to have them cut here", eem.Count(most, "cell"), eem.Count(bottles, "bottle"), first)}), "", ""))
	}
}

// checkBatches rejects batches that cannot be used as they are: most of their
// bottles failed, or nothing brings them to the scale of the others.
func (s *Survey) checkBatches() {
	limit := s.Limit("batch-rejected")
	reject := func(bt *Batch, n eem.Note) {
		n.Severity, n.File = eem.Reject, filepath.ToSlash(filepath.Base(s.Sheet.Path))
		s.Flags = append(s.Flags, eem.FlagFrom(n, "", bt.Name))
	}
	for _, bt := range s.Batches {
		if n := bt.rejected(); float64(n) > limit*float64(len(bt.Bottles)) {
			reject(bt, eem.Note{Test: "batch-rejected", Measure: true, Value: float64(n) / float64(len(bt.Bottles)), Limit: limit,
				Msg: fmt.Sprintf("%d of %s rejected; look for a common cause and measure the batch again", n, eem.Count(len(bt.Bottles), "bottle"))})
		}
		if bt.lacksScale() && len(s.Batches) > 1 {
			reject(bt, eem.Note{Test: "batch-scale", Msg: fmt.Sprintf("%s: no blank was subtracted and nothing brings its intensities to the scale of the other batches; "+
				"name a blank of another batch in the blanks column, measure the batch again, or leave it out with exclude", bt.Reason)})
		}
	}
}

// ScaleU returns the relative standard uncertainty of the batch's scale, NaN
// where it is not known. With borrowed blanks it holds by how much the bottles' own
// light is off theirs.
func (bt *Batch) ScaleU() float64 {
	if bt.Unit == eem.Quinine {
		return bt.Quinine.U / bt.Quinine.Slope
	}
	return math.Hypot(bt.Raman.U/bt.Raman.Area, bt.departure()) // NaN where there is no area
}
