package prepare

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// Names of the shared causes.
const (
	CauseScale       = "intensity scale"
	CauseRepeat      = "repeatability"
	CauseDilution    = "dilution"
	CauseBaseline    = "absorbance baseline"
	CauseAbsorbance  = "absorbance noise"
	CausePath        = "absorbance path"
	CauseSpectral    = "spectral factors"
	CauseTemperature = "temperature"
)

// Repeat is how well a measurement repeats itself: the relative standard
// deviation of one measurement of one liquid.
type Repeat struct {
	U, DF  float64 // NaN and 0 while unknown
	Source string
}

// fewestPairs is how many duplicate pairs are trusted before the blanks.
const fewestPairs = 5

// RepeatOf returns the repeatability of a setup: from five or more duplicate pairs
// of its samples, which see all of the handling; else from the Raman areas of
// replicate blanks, pooled over the batches; else from what pairs there are. From
// m pairs s = √(Σd²/2m), d the difference of the logarithms (METHODS 9.1).
//
// What is known of the instrument from elsewhere goes before both.
func (s *Survey) RepeatOf(setup string) Repeat {
	if s.known != nil && s.known.Repeat.DF > 0 {
		return s.known.Repeat
	}
	var ss, df float64
	for _, bt := range s.Batches {
		if bt.Setup != setup {
			continue
		}
		var a []float64
		for _, b := range bt.Blanks {
			if b.area > 0 {
				a = append(a, math.Log(b.area))
			}
		}
		mean := 0.0
		for _, v := range a {
			mean += v / float64(len(a))
		}
		for _, v := range a {
			ss += (v - mean) * (v - mean)
		}
		df += math.Max(0, float64(len(a)-1))
	}
	sum, pairs := s.pairs(setup)
	switch {
	case pairs >= fewestPairs || (pairs > 0 && df == 0):
		return Repeat{math.Sqrt(sum / (2 * pairs)), pairs, fmt.Sprintf("%g duplicate pairs", pairs)}
	case df > 0:
		return Repeat{math.Sqrt(ss / df), df, fmt.Sprintf("Raman areas of replicate blanks, %g degrees of freedom", df)}
	}
	return Repeat{U: nan}
}

// pairs sums d² over the duplicate pairs of a setup that have light enough.
func (s *Survey) pairs(setup string) (sum, n float64) {
	byID := map[string]*Bottle{}
	for _, b := range s.Bottles {
		byID[b.Row.ID] = b
	}
	for _, b := range s.Bottles {
		of := byID[b.Row.ReplicateOf]
		if b.Row.ReplicateOf == "" || of == nil || !b.Usable() || !of.Usable() || b.Row.Setup != setup || of.Row.Setup != setup {
			continue
		}
		if d, ok := logRatio(of.EEM, b.EEM); ok {
			sum, n = sum+d*d, n+1
		}
	}
	return sum, n
}

// logRatio is ln(b/a) of the whole maps, by least squares over common cells; false
// where they are not of one shape (congruence under 0.99), so that noise or another
// water decides.
func logRatio(a, b *eem.EEM) (float64, bool) {
	if !a.Grid.Equal(b.Grid) {
		return 0, false
	}
	var aa, ab, bb float64
	for i, v := range a.F {
		if w := b.F[i]; a.Why[i] == eem.Measured && b.Why[i] == eem.Measured {
			aa, ab, bb = aa+v*v, ab+v*w, bb+w*w
		}
	}
	if !(ab > 0.99*math.Sqrt(aa*bb)) {
		return 0, false
	}
	return math.Log(bb/aa) / 2, true
}

// listCauses gives every bottle the causes that its cells share, on the survey's
// grid. One that acts and that nobody stated has the uncertainty NaN.
func (s *Survey) listCauses() {
	repeat := map[string]Repeat{}
	for _, b := range s.Bottles {
		if !b.Usable() {
			continue
		}
		r, ok := repeat[b.Row.Setup]
		if !ok {
			r = s.RepeatOf(b.Row.Setup)
			repeat[b.Row.Setup] = r
		}
		b.Causes = append(b.scaleCauses(s, r), b.declared(s)...)
	}
}

// unknown is a cause of unknown size.
func (b *Bottle) unknown(name string, scope eem.Scope, key string) eem.Cause {
	return eem.Cause{Name: name, Scope: scope, Key: key, U: nan, Source: "not given"}
}

// scaleCauses are the error of the batch's scale, which rests on the mean of n
// blanks, and the bottle's own.
func (b *Bottle) scaleCauses(s *Survey, r Repeat) (out []eem.Cause) {
	if q := s.Find(b.Batch).Quinine; s.Unit == eem.Quinine && !b.skips(stepIntensity) && q.U > 0 {
		out = append(out, eem.Cause{Name: CauseScale, Scope: eem.OfBatch, Key: b.Batch, U: q.U / q.Slope, DF: float64(q.N - 1),
			Source: fmt.Sprintf("line of %d quinine standards", q.N)})
		if math.IsNaN(r.U) {
			return append(out, b.unknown(CauseRepeat, eem.OfBottle, b.Row.ID))
		}
		return append(out, eem.Cause{Name: CauseRepeat, Scope: eem.OfBottle, Key: b.Row.ID, U: r.U, DF: r.DF, Source: r.Source})
	}
	if math.IsNaN(r.U) {
		return []eem.Cause{b.unknown(CauseRepeat, eem.OfBottle, b.Row.ID), b.unknown(CauseScale, eem.OfBatch, b.Batch)}
	}
	out = append(out, eem.Cause{Name: CauseRepeat, Scope: eem.OfBottle, Key: b.Row.ID, U: r.U, DF: r.DF, Source: r.Source})
	n := float64(len(b.blanks))
	if d := s.Find(b.Batch).departure(); d > 0 && b.borrows() && s.Unit == eem.Raman && !b.skips(stepIntensity) {
		out = append(out, eem.Cause{Name: CauseScale, Scope: eem.OfBatch, Key: b.Batch, U: d,
			Source: "the bottles' own Raman light against that of borrowed blanks"})
	}
	if s.Unit != eem.Raman || b.skips(stepIntensity) || n == 0 {
		return append(out, b.unknown(CauseScale, eem.OfBatch, b.Batch))
	}
	return append(out, eem.Cause{Name: CauseScale, Scope: eem.OfBatch, Key: b.scaleKey(), U: r.U / math.Sqrt(n), DF: r.DF,
		Source: fmt.Sprintf("%s, over √%g", r.Source, n)})
}

// scaleKey names the blanks that the scale rests on.
func (b *Bottle) scaleKey() string {
	key := ""
	for _, blank := range b.blanks {
		key += blank.Row.ID + "\n"
	}
	return key
}

// declared are the causes whose size only the laboratory knows.
func (b *Bottle) declared(s *Survey) (out []eem.Cause) {
	u := s.Settings.Uncertainty
	relative := func(name string, d survey.Declared, acts bool, c eem.Cause) {
		switch {
		case !acts:
		case !d.Given:
			out = append(out, b.unknown(name, eem.OfBottle, b.Row.ID))
		case c.U != 0 || c.Ex != nil || c.Shape != nil:
			c.Name, c.Source = name, "settings: uncertainty"
			out = append(out, c)
		}
	}
	own := eem.Cause{Scope: eem.OfBottle, Key: b.Row.ID}
	c := own
	c.U = u.DilutionPercent.Value / 100
	relative(CauseDilution, u.DilutionPercent, !b.skips(stepDilution) && b.Row.Dilution != 1, c)
	inner := b.scanned != nil && !b.skips(stepInner) && b.Setting.Correct.InnerFilter != "none"
	relative(CauseBaseline, u.Absorbance, inner, b.absorbanceCause(s.Grid, own, func(a float64) float64 {
		return u.Absorbance.Value / b.scanned.PathCM * b.Row.AbsorbanceDilution / b.Row.Dilution
	}))
	relative(CausePath, u.PathPercent, inner, b.absorbanceCause(s.Grid, own, func(a float64) float64 { return -a * u.PathPercent.Value / 100 }))
	if sd := b.absorbanceNoise(); inner && sd > 0 {
		c := b.absorbanceCause(s.Grid, own, func(float64) float64 { return sd })
		c.Name, c.Source, c.Apart = CauseAbsorbance, "roughness of the absorbance spectrum", true
		out = append(out, c)
	}
	out = append(out, b.spectralCauses(s)...)
	if t := b.Setting.Correct.Temperature; t.On {
		c = own
		c.U = t.PercentPerC / 100 * u.TemperatureC.Value
		relative(CauseTemperature, u.TemperatureC, true, c)
	}
	return out
}

// absorbanceNoise is the standard deviation of single readings of the absorbance of
// the scanned liquid, per cm, from the second differences of its spectrum, which
// have six times the variance of a reading; their median, so that bands do not
// count.
func (b *Bottle) absorbanceNoise() float64 {
	if b.scanned == nil {
		return 0
	}
	var d []float64
	a := b.scanned.A
	for i := 1; i+1 < len(a); i++ {
		if v := math.Abs(a[i-1] - 2*a[i] + a[i+1]); v == v {
			d = append(d, v)
		}
	}
	if len(d) < 10 {
		return 0
	}
	slices.Sort(d)
	const normal = 0.6744897501960817 // median of |z|
	return d[len(d)/2] / normal / math.Sqrt(6) / b.scanned.PathCM
}

// absorbanceCause turns an error d(a) of the absorbance a (per cm) into relative
// changes along both axes. A cell-shaped change, where the geometry is not one of
// separate axes, is taken at the middle of the other axis.
func (b *Bottle) absorbanceCause(g eem.Grid, c eem.Cause, d func(a float64) float64) eem.Cause {
	if b.scanned == nil || b.Setting.Correct.InnerFilter == "none" {
		return c
	}
	geo := geometry(b.Setting.Correct)
	at := func(nm float64) float64 {
		if a := b.scanned.PerCM(nm); !math.IsNaN(a) {
			return a
		}
		return 0
	}
	midEx, midEm := at(g.Ex.At(g.Ex.Len()/2)), at(g.Em.At(g.Em.Len()/2))
	c.Ex, c.Em = make([]float64, g.Ex.Len()), make([]float64, g.Em.Len())
	for j := range c.Ex {
		a := at(g.Ex.At(j))
		s, _ := geo.Sensitivity(a, midEm)
		c.Ex[j] = s * d(a)
	}
	for k := range c.Em {
		a := at(g.Em.At(k))
		_, s := geo.Sensitivity(midEx, a)
		c.Em[k] = s * d(a)
	}
	return c
}

// spectralCauses are the errors of the factor tables, one a table with
// uncertainties, else what the settings state.
func (b *Bottle) spectralCauses(s *Survey) (out []eem.Cause) {
	f := s.factors[b.Row.Setup]
	if b.skips(stepSpectral) || (f.ex == nil && f.em == nil) {
		return nil
	}
	if d := s.Settings.Uncertainty.SpectralPercent; d.Given {
		return []eem.Cause{{Name: CauseSpectral, Scope: eem.OfSurvey, Key: b.Row.Setup, U: d.Value / 100, Source: "settings: uncertainty"}}
	}
	for i, t := range []*correct.Factors{f.ex, f.em} {
		switch {
		case t == nil:
			continue
		case t.U == nil:
			out = append(out, b.unknown(CauseSpectral, eem.OfSurvey, t.Source))
			continue
		}
		c := eem.Cause{Name: CauseSpectral, Scope: eem.OfSurvey, Key: t.Source, Source: t.Source}
		if i == 0 {
			_, c.Ex = t.On(s.Grid.Ex)
			clean(c.Ex)
		} else {
			_, c.Em = t.On(s.Grid.Em)
			clean(c.Em)
		}
		out = append(out, c)
	}
	return out
}

// clean sets what is not known to 0: there the cells are missing.
func clean(v []float64) {
	for i, x := range v {
		if math.IsNaN(x) {
			v[i] = 0
		}
	}
}
