package prepare

import (
	"fmt"
	"math"
	"path/filepath"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// Verdict says in one word what a batch is worth by its reading, and why; what
// checkBatches found on it as a whole is not among the reasons.
func (bt *Batch) Verdict() (verdict string, reasons []string) {
	verdict = "good"
	if bt.lacksScale() {
		verdict, reasons = "doubt", append(reasons, "no intensity scale: "+bt.Reason)
	}
	if n := bt.rejected(); n > 0 {
		reasons = append(reasons, fmt.Sprintf("%d of %s of all kinds rejected", n, eem.Count(len(bt.Bottles), "bottle")))
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
