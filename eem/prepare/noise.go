package prepare

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// fewestBlanks is how many replicate blanks a noise model needs.
const fewestBlanks = 3

// startNoise is called with the counts less the offset. A blank keeps them for the
// noise model of its batch; a bottle of a setup that has too few blanks gives its
// own. Every cell starts with a variance of 1, so that the steps to come leave the
// square of what they multiply a count by.
func (b *Bottle) startNoise(s *Survey, e *eem.EEM) *eem.EEM {
	switch {
	case b.Row.Kind == survey.Blank:
		b.counts = e
	case s.blankRows(b.Row.Setup) < fewestBlanks:
		if n, err := correct.NoiseFrom(e, 0, scatter.In(Bands(b.Setting.Scatter))); err == nil {
			b.noise = &n
		}
	}
	out := *e
	out.Var = make([]float64, len(e.F))
	for i := range out.Var {
		out.Var[i] = 1
	}
	return &out
}

// blankRows counts the sheet's rows that can give the noise model of a setup.
func (s *Survey) blankRows(setup string) int {
	n := 0
	for i := range s.Sheet.Rows {
		r := &s.Sheet.Rows[i]
		if r.Kind == survey.Blank && r.Setup == setup && r.Exclude == "" && r.ExcludeFromFit == "" {
			n++
		}
	}
	return n
}

// takeGain takes the variances off again, and the shared causes, which listCauses
// gives all at once.
func (b *Bottle) takeGain(e *eem.EEM) *eem.EEM {
	b.gain = make([]float32, len(e.F))
	for i, v := range e.Var {
		b.gain[i] = float32(math.Sqrt(v))
	}
	out := *e
	out.Var, out.Causes = nil, nil
	return &out
}

// Known is what is known of an instrument.
type Known struct {
	Noise  *correct.Noise // nil: unknown
	Repeat Repeat         // U NaN or DF 0: unknown
}

// KnownOf returns what the survey tells of the instrument of a setup.
func (s *Survey) KnownOf(setup string) Known { return Known{s.noiseOf[setup], s.RepeatOf(setup)} }

// setNoise finds the noise model of every bottle: from three or more blanks of its
// batch, else what is known of the instrument, else from all blanks of its setup,
// else from its own scans.
func (s *Survey) setNoise() {
	bySetup := map[string][]*eem.EEM{}
	for _, bt := range s.Batches {
		bySetup[bt.Setup] = append(bySetup[bt.Setup], bt.counts()...)
	}
	pooled := map[string]*correct.Noise{}
	for setup, blanks := range bySetup {
		pooled[setup] = fitNoise(blanks)
	}
	s.noiseOf = pooled
	for _, bt := range s.Batches {
		n, from := fitNoise(bt.counts()), "blanks of the batch"
		switch {
		case n != nil:
		case s.known != nil && s.known.Noise != nil:
			n, from = s.known.Noise, "blanks of the model's survey"
		default:
			n, from = pooled[bt.Setup], "blanks of the setup"
		}
		alone := 0
		for _, b := range bt.Bottles {
			if n != nil {
				b.noise = n
			} else if b.noise != nil {
				alone++
			}
		}
		bt.noteNoise(n, from)
		if alone > 0 {
			s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "noise-default", Severity: eem.Remark,
				Msg: fmt.Sprintf("fewer than %d blanks to go by for %s; the noise was estimated from the roughness of its own scans: measure %d blanks a day", fewestBlanks, eem.Count(alone, "bottle"), fewestBlanks)}), "", bt.Name))
		}
	}
}

// counts returns the counts of the batch's usable blanks.
func (bt *Batch) counts() []*eem.EEM {
	var out []*eem.EEM
	for _, b := range bt.Blanks {
		if b.counts != nil {
			out = append(out, b.counts)
		}
	}
	return out
}

// fitNoise returns the model of three or more blanks on one grid, nil where they
// give none.
func fitNoise(blanks []*eem.EEM) *correct.Noise {
	for _, b := range blanks {
		if !b.Grid.Equal(blanks[0].Grid) {
			return nil
		}
	}
	n, err := correct.FitNoise(blanks, 0)
	if err != nil {
		return nil
	}
	return &n
}

// noteNoise records the model in the history of the batch's bottles.
func (bt *Batch) noteNoise(n *correct.Noise, from string) {
	for _, b := range bt.Bottles {
		m, source := b.noise, "the bottle's own scans"
		if n != nil {
			m, source = n, fmt.Sprintf("%d %s", n.Blanks, from)
		}
		if m == nil || b.raw == nil {
			continue
		}
		unit, per := "counts", "count"
		if b.skips(stepIntensity) && bt.Unit != eem.Counts {
			unit, per = string(bt.Unit), string(bt.Unit) // the files came in it
		}
		e := *b.raw
		e.Notes = append(slices.Clone(e.Notes), eem.Note{Step: correct.StepNoise, Msg: "variance of every cell: read noise squared plus shot noise", Params: []eem.Param{
			{Name: "read noise", Value: fmt.Sprintf("%.6g", m.Read), Unit: unit, Source: source},
			{Name: "shot noise, variance per " + per, Value: fmt.Sprintf("%.6g", m.Shot), Unit: unit, Source: source}}})
		if b.EEM == b.raw {
			b.EEM = &e
		}
		b.raw = &e
	}
}

// variance returns the noise variance of cell i of the bottle's raw EEM: with g
// the intensity for one count, Read²·g² + Shot·g·F.
func (b *Bottle) variance(i int) float64 {
	g := float64(b.gain[i])
	return b.noise.Read*b.noise.Read*g*g + b.noise.Shot*g*max(0, b.raw.F[i])
}

// withNoise gives e, the blank subtracted, the variance of the bottle's own noise;
// that of the blank, which bottles share, stays apart.
func (b *Bottle) withNoise(e *eem.EEM) *eem.EEM {
	if b.noise == nil {
		return e
	}
	out := *e
	out.Var = make([]float64, len(e.F))
	for i := range out.Var {
		out.Var[i] = b.variance(i)
	}
	return &out
}

// takeNoise keeps the noise of the corrected bottle as one float32 a cell, and
// names its set of blanks.
func (b *Bottle) takeNoise(e *eem.EEM) *eem.EEM {
	if e.Var == nil || b.noise == nil {
		return e
	}
	b.u = make([]float32, len(e.Var))
	for i, v := range e.Var {
		b.u[i] = float32(math.Sqrt(v))
	}
	if len(b.blanks) > 0 && !b.skips(stepBlank) && b.Setting.Correct.Blank != "none" {
		ids := make([]string, len(b.blanks))
		for i, blank := range b.blanks {
			ids[i] = blank.Row.ID
		}
		b.BlankSet = strings.Join(ids, "\n")
	}
	out := *e
	out.Var, out.Causes = nil, nil
	return &out
}

// perScale is what the intensity scale multiplied the bottle by.
func (b *Bottle) perScale() float64 {
	if math.IsNaN(b.scale) {
		return 1
	}
	return 1 / b.scale
}

// blankNoise fills BlankU.
func (s *Survey) blankNoise() {
	s.BlankU = map[string][]float32{}
	for _, b := range s.Bottles {
		if b.BlankSet == "" || !b.Usable() || s.BlankU[b.BlankSet] != nil {
			continue
		}
		es := make([]*eem.EEM, 0, len(b.blanks))
		for _, blank := range b.blanks {
			if blank.noise == nil || blank.raw == nil {
				continue
			}
			e := *blank.raw
			e.Var = make([]float64, len(e.F))
			for i := range e.Var {
				e.Var[i] = blank.variance(i)
			}
			es = append(es, e.Regrid(s.Grid))
		}
		mean, err := correct.Mean(es)
		if err != nil || len(es) < len(b.blanks) {
			continue
		}
		by := b.perScale()
		u := make([]float32, s.Grid.Cells())
		for i, v := range mean.Var {
			u[i] = float32(by * math.Sqrt(v))
		}
		s.BlankU[b.BlankSet] = u
	}
}

// cellNoise stacks the noise of the bottles on the survey's grid, NaN where it is
// not known; nil where that of none is.
func (s *Survey) cellNoise(bottles []*Bottle) []float32 {
	if !slices.ContainsFunc(bottles, func(b *Bottle) bool { return b.u != nil }) {
		return nil
	}
	n := s.Grid.Cells()
	out := make([]float32, len(bottles)*n)
	for i, b := range bottles {
		row := out[i*n : (i+1)*n]
		switch {
		case b.u == nil:
			for l := range row {
				row[l] = float32(nan)
			}
		case b.EEM.Grid.Equal(s.Grid):
			copy(row, b.u)
		default:
			e := *b.EEM
			e.Var = make([]float64, len(b.u))
			for l, u := range b.u {
				e.Var[l] = float64(u) * float64(u)
			}
			for l, v := range s.onGrid(&e).Var {
				row[l] = float32(math.Sqrt(v))
			}
		}
	}
	return out
}
