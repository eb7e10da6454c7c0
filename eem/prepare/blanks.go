package prepare

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
)

// checkLevels tells which blanks glow and which one departs from the others.
func (bt *Batch) checkLevels(s *Survey) {
	for _, b := range bt.Blanks {
		if !b.rawLight() {
			continue
		}
		v, ex, em, ok := b.glow()
		b.glowPercent, b.glowFound = v, ok
		if limit := s.Limit("blank-level"); ok && v > limit {
			b.flag(s, eem.Note{Test: "blank-level", Severity: eem.Doubt, Measure: true, Value: v, Limit: limit,
				Msg: fmt.Sprintf("glows at ex %g / em %g nm by %.0f %% of its Raman line, where pure water does not; look for a dirty cell or spoiled water", ex, em, v)})
		}
	}
	bt.checkDrift(s)
}

// glow returns the brightest spot of a blank outside the scatter bands, a mean of
// 3 × 5 neighbouring cells above the lower quartile of all of them, in percent of
// the height of its own Raman line at the scale's excitation.
func (b *Bottle) glow() (percent, ex, em float64, ok bool) {
	height := nan
	for _, p := range scatter.Ridge(b.raw, scatter.Raman1, ramanWindow) {
		if math.Abs(p.ExNM-b.Setting.Intensity.ExcitationNM) < 3 {
			height = p.Height
		}
	}
	if !(height > 0) {
		return nan, nan, nan, false
	}
	e := b.raw.Clone()
	near := nearLines(b.Setting.Scatter)
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			if x, m := e.Ex.At(j), e.Em.At(k); m < x || near(x, m) {
				e.Drop(e.Index(j, k), eem.BelowExcitation)
			}
		}
	}
	var means []float64
	top := math.Inf(-1)
	for j := 1; j+1 < e.Ex.Len(); j++ {
		for k := 2; k+2 < e.Em.Len(); k++ {
			v := spot(e, j, k)
			if math.IsNaN(v) {
				continue
			}
			means = append(means, v)
			if v > top {
				top, ex, em = v, e.Ex.At(j), e.Em.At(k)
			}
		}
	}
	if len(means) < 20 { // too few cells are left to tell a spot from the rest
		return nan, nan, nan, false
	}
	slices.Sort(means)
	return 100 * (top - means[len(means)/4]) / height, ex, em, true
}

// spot is the mean of the 3 × 5 cells around (j, k), NaN where one is missing.
func spot(e *eem.EEM, j, k int) float64 {
	sum := 0.0
	for dj := -1; dj <= 1; dj++ {
		for dk := -2; dk <= 2; dk++ {
			sum += e.At(j+dj, k+dk)
		}
	}
	return sum / 15
}

// checkDrift flags the blank whose Raman area departs most from the mean of the
// others, the later one of two.
func (bt *Batch) checkDrift(s *Survey) {
	var sum, n float64
	for _, b := range bt.Blanks {
		if b.area > 0 {
			sum, n = sum+b.area, n+1
		}
	}
	if n < 2 {
		return
	}
	var worst *Bottle
	dev := 0.0
	for _, b := range bt.Blanks {
		if !(b.area > 0) {
			continue
		}
		others := (sum - b.area) / (n - 1)
		if d := 100 * (b.area/others - 1); worst == nil || math.Abs(d) >= math.Abs(dev) || n == 2 {
			worst, dev = b, d
		}
	}
	if limit := s.Limit("blank-drift"); math.Abs(dev) > limit {
		worst.flag(s, eem.Note{Test: "blank-drift", Severity: eem.Doubt, Measure: true, Value: dev, Limit: limit,
			Msg: fmt.Sprintf("its Raman area is %+.1f %% off that of the batch's other blanks; look whether the lamp drifted, and measure the batch again if it did", dev)})
	}
}

// BlankSpread returns the standard deviation of a cell among the batch's blanks,
// outside the scatter bands, in counts; NaN with fewer than two blanks.
func (bt *Batch) BlankSpread() float64 { return bt.spread }

// findSpread computes it: the root mean square of what each blank differs from
// the mean, times n/(n−1).
func (bt *Batch) findSpread() {
	bt.spread = nan
	if len(bt.Blanks) < 2 {
		return
	}
	es := make([]*eem.EEM, len(bt.Blanks))
	for i, b := range bt.Blanks {
		es[i] = scatter.Mask(b.raw.Regrid(bt.Blanks[0].raw.Grid), Bands(b.Setting.Scatter))
	}
	mean, err := correct.Mean(es)
	if err != nil {
		return
	}
	ss, cells := 0.0, 0.0
	for _, e := range es {
		for i, v := range e.F {
			if d := v - mean.F[i]; !math.IsNaN(d) {
				ss, cells = ss+d*d, cells+1
			}
		}
	}
	if n := float64(len(es)); cells > 0 {
		bt.spread = math.Sqrt(ss / cells * n / (n - 1))
	}
}
