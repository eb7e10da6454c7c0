package prepare

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/optics"
	"tarnlight/eem/scatter"
)

// checkLevels tells which blanks glow and which one departs from the others.
func (bt *Batch) checkLevels(s *Survey) {
	maps := make([]*glowMap, len(bt.Blanks))
	for i, b := range bt.Blanks {
		if b.rawLight() {
			maps[i] = b.glowMap()
		}
	}
	for i, b := range bt.Blanks {
		if maps[i] == nil {
			continue
		}
		g := maps[i].glow(maps)
		b.Glow = &g
		if limit := s.Limit("blank-level"); g.Percent > limit {
			b.flag(s, eem.Note{Test: "blank-level", Severity: eem.Doubt, Measure: true, Value: g.Percent, Limit: limit,
				Msg: fmt.Sprintf("glows at ex %s / em %s nm by %.0f %% of its Raman line, where pure water does not%s; its spectra stand in blanks.csv of the results; look for a dirty cell or spoiled water",
					eem.NM(g.ExNM), eem.NM(g.EmNM), g.Percent, optics.Like(g.ExNM, g.EmNM))})
		}
	}
	bt.checkDrift(s)
}

// Glow tells where and how much a blank shines outside the scatter bands, in percent
// of the height of its own Raman line at the scale's excitation.
type Glow struct {
	Percent, ExNM, EmNM  float64     // of the brightest spot
	Excitation, Emission []GlowPoint // spectra through it, on the blank's own axes
}

// GlowPoint is one point of a spectrum of a blank. Others is what the batch's other
// blanks show there, their mean. NaN: in a scatter band, or no other blank.
type GlowPoint struct{ NM, Percent, Others float64 }

// glowMap is a blank without its scatter bands, in percent of its own Raman line
// above the lower quartile of its cells.
type glowMap struct {
	*eem.EEM
	percent, ex, em float64 // of the brightest spot, a mean of 3 × 5 cells
	j, k            int     // where that is
}

// glowMap returns nil where the blank shows no Raman line or too few cells are left.
func (b *Bottle) glowMap() *glowMap {
	height := nan
	for _, p := range scatter.Ridge(b.raw, scatter.Raman1, ramanWindow) {
		if math.Abs(p.ExNM-b.Setting.Intensity.ExcitationNM) < 3 {
			height = p.Height
		}
	}
	if !(height > 0) {
		return nil
	}
	m := &glowMap{EEM: b.raw.Clone()}
	near := nearLines(b.Setting.Scatter)
	for j := range m.Ex.Len() {
		for k := range m.Em.Len() {
			if x, y := m.Ex.At(j), m.Em.At(k); y < x || near(x, y) {
				m.Drop(m.Index(j, k), eem.BelowExcitation)
			}
		}
	}
	if !m.brightest(height) {
		return nil
	}
	return m
}

// brightest finds the brightest spot and brings the cells to percent; false where too
// few cells are left to tell a spot from the rest.
func (m *glowMap) brightest(height float64) bool {
	var means []float64
	top := math.Inf(-1)
	for j := 1; j+1 < m.Ex.Len(); j++ {
		for k := 2; k+2 < m.Em.Len(); k++ {
			v := spot(m.EEM, j, k, 1, 2)
			if math.IsNaN(v) {
				continue
			}
			means = append(means, v)
			if v > top {
				top, m.j, m.k = v, j, k
			}
		}
	}
	if len(means) < 20 {
		return false
	}
	slices.Sort(means)
	base := means[len(means)/4]
	m.percent, m.ex, m.em = 100*(top-base)/height, m.Ex.At(m.j), m.Em.At(m.k)
	for i := range m.F {
		m.F[i] = 100 * (m.F[i] - base) / height
	}
	return true
}

// spot is the mean of the cells up to dj excitations and dk emissions off (j, k), NaN
// where one is missing.
func spot(e *eem.EEM, j, k, dj, dk int) float64 {
	sum := 0.0
	for x := max(0, j-dj); x <= min(e.Ex.Len()-1, j+dj); x++ {
		for m := max(0, k-dk); m <= min(e.Em.Len()-1, k+dk); m++ {
			sum += e.At(x, m)
		}
	}
	return sum / float64((min(e.Ex.Len()-1, j+dj)-max(0, j-dj)+1)*(min(e.Em.Len()-1, k+dk)-max(0, k-dk)+1))
}

// glow reads the spectra through the brightest spot, each a mean over three
// excitations or five emissions, beside those of the other blanks.
func (m *glowMap) glow(all []*glowMap) Glow {
	g := Glow{Percent: m.percent, ExNM: m.ex, EmNM: m.em}
	others := make([]*eem.EEM, 0, len(all))
	for _, o := range all {
		if o != nil && o != m {
			others = append(others, o.Regrid(m.Grid))
		}
	}
	point := func(nm float64, at func(e *eem.EEM) float64) GlowPoint {
		p := GlowPoint{NM: nm, Percent: at(m.EEM), Others: 0}
		for _, o := range others {
			p.Others += at(o) / float64(len(others))
		}
		if len(others) == 0 {
			p.Others = nan
		}
		return p
	}
	for j := range m.Ex.Len() {
		g.Excitation = append(g.Excitation, point(m.Ex.At(j), func(e *eem.EEM) float64 { return spot(e, j, m.k, 0, 2) }))
	}
	for k := range m.Em.Len() {
		g.Emission = append(g.Emission, point(m.Em.At(k), func(e *eem.EEM) float64 { return spot(e, m.j, k, 1, 0) }))
	}
	return g
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
