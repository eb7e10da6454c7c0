package prepare

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// Batch is a set of bottles measured together: one setup, one day, or what the
// sheet names a batch.
type Batch struct {
	Name    string
	Setup   string
	Day     string // of its first bottle, empty when unknown
	Bottles []*Bottle
	Blanks  []*Bottle // usable blanks
	Raman   correct.RamanArea
	Quinine correct.QuinineLine // of the batch's quinine standards; Slope NaN unknown
	Reason  string              // why the batch has no intensity scale, empty when it has one
	Unit    eem.Unit

	peakNM, peakSNR float64
	loan            *loan   // nil where it rests on its own blanks
	spread          float64 // of a cell among the blanks, counts
}

func batchName(r *survey.Row) string {
	switch day := r.Measured.Day(); {
	case r.Batch != "":
		return r.Batch
	case r.Setup != "" && day != "":
		return r.Setup + " " + day
	case day != "":
		return day
	case r.Setup != "":
		return r.Setup
	}
	return "all"
}

// Find returns the batch of that name.
func (s *Survey) Find(batch string) *Batch {
	for _, b := range s.Batches {
		if b.Name == batch {
			return b
		}
	}
	return nil
}

// formBatches groups bottles and finds every batch's blanks and Raman area.
func (s *Survey) formBatches() {
	s.gatherGuesses()
	unnamed := 0
	for _, b := range s.Bottles {
		if b.Excluded {
			continue
		}
		if b.Row.Batch == "" && b.Row.Measured.Day() == "" {
			unnamed++
		}
		bt := s.Find(b.Batch)
		if bt == nil {
			bt = &Batch{Name: b.Batch, Setup: b.Row.Setup, Day: b.Row.Measured.Day(), Quinine: correct.QuinineLine{Slope: nan, U: nan}, Raman: correct.RamanArea{Area: nan, U: nan}}
			s.Batches = append(s.Batches, bt)
		}
		bt.Bottles = append(bt.Bottles, b)
		if b.Row.Kind == survey.Blank && b.Usable() && b.Row.ExcludeFromFit == "" {
			bt.Blanks = append(bt.Blanks, b)
			set := b.Setting.Intensity
			if a, err := correct.Area(b.EEM, set.ExcitationNM, set.WindowNM, set.Baseline); err == nil {
				b.area = a
			}
		}
	}
	if unnamed > 0 {
		s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "no-batch", Severity: eem.Remark, File: filepath.Base(s.Sheet.Path),
			Msg: fmt.Sprintf("without batch and measured: %s, put into batches by setup alone", eem.Count(unnamed, "row"))}), "", ""))
	}
	for _, b := range s.Bottles {
		if !b.Excluded && !b.Rejected {
			b.blanks = s.blanksOf(b)
		}
	}
	for _, bt := range s.Batches {
		bt.checkBlanks(s)
		bt.checkLevels(s)
		bt.findScale()
		bt.findPeak()
	}
	s.findBands()
	for _, bt := range s.Batches {
		bt.findSpread()
	}
}

// blanksOf returns the blanks that serve a bottle.
func (s *Survey) blanksOf(b *Bottle) []*Bottle {
	how := b.Setting.Correct.Blank
	if len(b.Row.Blanks) > 0 && how != "none" {
		var out []*Bottle
		for _, id := range b.Row.Blanks {
			for _, c := range s.Bottles {
				if c.Row.ID == id && c.Usable() {
					out = append(out, c)
				}
			}
		}
		return out
	}
	switch how {
	case "batch-mean":
		return s.Find(b.Batch).Blanks
	case "latest":
		return s.latest(b)
	}
	return nil // "listed" without a list, or "none"
}

// latest returns the blanks of the last batch of the bottle's setup that were
// measured at or before the bottle and are not too old.
func (s *Survey) latest(b *Bottle) []*Bottle {
	if bt := s.Find(b.Batch); len(bt.Blanks) > 0 {
		return bt.Blanks
	}
	if b.Row.Measured.IsZero() {
		return nil
	}
	var best []*Bottle
	var when time.Time
	for _, bt := range s.Batches {
		if len(bt.Blanks) == 0 || bt.Setup != b.Row.Setup {
			continue
		}
		t := bt.Blanks[len(bt.Blanks)-1].Row.Measured.Time
		age := b.Row.Measured.Sub(t).Hours() / 24
		most := b.Setting.Correct.BlankMaxAgeDays
		if age < 0 || (most > 0 && age > most) || !t.After(when) {
			continue
		}
		best, when = bt.Blanks, t
	}
	return best
}

// findScale looks for what sets the batch's intensity scale.
func (bt *Batch) findScale() {
	first := bt.Bottles[0]
	set := first.Setting.Intensity
	blanks := bt.Blanks
	if len(blanks) == 0 {
		blanks = first.blanks
	}
	if len(blanks) == 0 {
		bt.Reason = "no usable blank"
		return
	}
	es := make([]*eem.EEM, len(blanks))
	for i, b := range blanks {
		es[i] = b.EEM
	}
	r, err := correct.Areas(es, set.ExcitationNM, set.WindowNM, set.Baseline)
	if err != nil {
		bt.Reason = err.Error()
		return
	}
	r.From = fromOf(blanks, bt.Name)
	bt.Raman = r
}

// chooseUnit decides the one unit of the survey.
func (s *Survey) chooseUnit() error {
	var units []eem.Unit
	for _, bt := range s.Batches {
		u, err := s.unitOf(bt)
		if err != nil {
			return err
		}
		bt.Unit = u
		units = append(units, u)
	}
	if len(units) == 0 {
		return fmt.Errorf("%s: every row is excluded; nothing is left to do", s.Sheet.Path)
	}
	if s.scaled() && slices.Contains(units, eem.Counts) {
		// auto: Raman units only where every batch can have them.
		var without []string
		for _, bt := range s.Batches {
			if bt.Unit == eem.Counts {
				without = append(without, fmt.Sprintf("%s (%s)", bt.Name, bt.Reason))
			}
			bt.Unit = eem.Counts
		}
		s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "counts", Severity: eem.Doubt, File: filepath.Base(s.Sheet.Path),
			Msg: "results stay in counts, because these batches allow no intensity scale: " + strings.Join(without, ", ")}), "", ""))
	}
	s.Unit = s.Batches[0].Unit
	for _, bt := range s.Batches {
		if bt.Unit != s.Unit {
			return fmt.Errorf("batch %s is in %s, batch %s in %s; give both setups one [intensity] unit", s.Batches[0].Name, s.Unit, bt.Name, bt.Unit)
		}
	}
	return nil
}

// scaled says whether any batch asks for a scale to be found by itself.
func (s *Survey) scaled() bool {
	return slices.ContainsFunc(s.Batches, func(bt *Batch) bool {
		first := bt.Bottles[0]
		return first.Setting.Intensity.Unit == "auto" && !first.skips(stepIntensity)
	})
}

// Given is the unit of intensities that came scaled, while no setting says how.
const Given eem.Unit = "a.u."

func (s *Survey) unitOf(bt *Batch) (eem.Unit, error) {
	first := bt.Bottles[0]
	want := first.Setting.Intensity.Unit
	if first.done(stepIntensity) {
		return map[string]eem.Unit{"auto": Given, "raman": eem.Raman, "quinine": eem.Quinine, "counts": eem.Counts}[want], nil
	}
	if first.off(stepIntensity) {
		return eem.Counts, nil
	}
	switch want {
	case "raman":
		if bt.Reason != "" && !s.keepUnit {
			return "", fmt.Errorf("batch %s cannot be given in Raman units: %s; add a blank of that batch to the sheet, name one in the blanks column, or set [intensity] unit = \"counts\"", bt.Name, bt.Reason)
		}
		return eem.Raman, nil
	case "quinine":
		if err := bt.findQuinine(); err != nil && !s.keepUnit {
			return "", fmt.Errorf("batch %s cannot be given in quinine sulfate units: %w; add standards with a column conc:quinine… [µg/L] that cover ex %d / em %d nm, or set [intensity] unit = \"raman\"", bt.Name, err, quinineEx, quinineEm)
		}
		return eem.Quinine, nil
	case "counts":
		return eem.Counts, nil
	}
	if bt.Reason != "" {
		return eem.Counts, nil
	}
	return eem.Raman, nil
}

// Where quinine sulfate is read, nm, by custom.
const quinineEx, quinineEm = 350, 450

// findQuinine fits the line of intensity at ex 350 / em 450 nm, blank subtracted,
// against µg/L of quinine sulfate over the batch's standards.
func (bt *Batch) findQuinine() error {
	var es []*eem.EEM
	var microg []float64
	for _, b := range bt.Bottles {
		if b.Row.Kind != survey.Standard || !b.Usable() || b.Row.ExcludeFromFit != "" {
			continue
		}
		for _, c := range b.Row.Conc {
			factor, ok := map[string]float64{"µg/l": 1, "μg/l": 1, "ug/l": 1, "ppb": 1, "mg/l": 1000, "ppm": 1000}[strings.ToLower(c.Unit)]
			if !ok || !strings.Contains(strings.ToLower(c.Name), "quinine") || !(c.Value > 0) {
				continue
			}
			// A level that is clipped there has no say.
			if e, err := b.lessBlank(); err == nil && !math.IsNaN(e.Interp(quinineEx, quinineEm)) {
				es, microg = append(es, e), append(microg, c.Value*factor)
			}
		}
	}
	q, err := correct.Quinine(es, microg, quinineEx, quinineEm)
	if err == nil {
		bt.Quinine = q
	}
	return err
}
