package report

import (
	"fmt"
	"image"
	"math"
	"slices"

	"tarnlight/eem"
)

// Sizes of a triptych in pixels: 170 mm wide at 200 dpi, letters of 7 points.
const (
	triW      = 1340
	panelW    = 330
	panelH    = 300
	triLeft   = 84
	triHead   = 62
	rowTitle  = 34
	rowFoot   = 74
	barW      = 16
	triRow    = rowTitle + panelH + rowFoot
	triModelX = triLeft + panelW + 50
	triBarX   = triModelX + panelW + 12
	triResX   = triBarX + barW + 84
	triResBar = triResX + panelW + 12
)

// triptych draws measured, model and residual of one bottle side by side, one
// row a method. Frames, axes and their letters are the same for all bottles of a
// survey and are drawn once.
type triptych struct {
	grid    eem.Grid
	unit    string
	methods []string
	num     numbers
	ground  canvas
	maps    [][3]*mapping // per method
	small   *lettering
	head    *lettering
}

// newTriptych draws the ground. titles[m] describes methods[m].
func newTriptych(g eem.Grid, unit eem.Unit, methods, titles []string, num numbers) *triptych {
	t := &triptych{grid: g, unit: string(unit), methods: methods, num: num, small: regular(19), head: bold(25)}
	rows := max(1, len(methods))
	t.ground = newCanvas(triW, triHead+rows*triRow)
	for m := range rows {
		top := triHead + m*triRow + rowTitle
		var maps [3]*mapping
		for p, x := range []int{triLeft, triModelX, triResX} {
			maps[p] = newMapping(image.Rect(x, top, x+panelW, top+panelH), g)
			t.drawAxes(maps[p], p == 0)
		}
		t.maps = append(t.maps, maps)
		t.ground.text(t.small, "Measured", triLeft, top-11, left)
		title := "Model"
		if m < len(titles) {
			title += ": " + plain(titles[m])
		}
		t.ground.text(t.small, t.small.fit(title, panelW+barW+60), triModelX, top-11, left)
		t.ground.text(t.small, "Residual: measured − model", triResX, top-11, left)
		t.drawBar(triBarX, top, false)
		t.drawBar(triResBar, top, true)
	}
	return t
}

func (t *triptych) drawAxes(m *mapping, labels bool) {
	c := t.ground
	c.fill(m.r, missing)
	c.frame(m.r, greys)
	lo, hi := edges(t.grid.Em)
	at := ticks(lo, hi, 5)
	for i, s := range first(t.num.tickText(at)) {
		x := m.x(at[i])
		c.fill(image.Rect(x, m.r.Max.Y, x+1, m.r.Max.Y+7), greys)
		c.text(t.small, s, x, m.r.Max.Y+27, centre)
	}
	c.text(t.small, "Emission wavelength (nm)", (m.r.Min.X+m.r.Max.X)/2, m.r.Max.Y+53, centre)
	lo, hi = edges(t.grid.Ex)
	at = ticks(lo, hi, 5)
	for i, s := range first(t.num.tickText(at)) {
		y := m.y(at[i])
		c.fill(image.Rect(m.r.Min.X-7, y, m.r.Min.X, y+1), greys)
		if labels {
			c.text(t.small, s, m.r.Min.X-11, y+7, right)
		}
	}
	if labels {
		c.textUp(t.small, "Excitation wavelength (nm)", 26, (m.r.Min.Y+m.r.Max.Y)/2)
	}
}

func first(s []string, _ int) []string { return s }

// drawBar draws a colour bar without its numbers.
func (t *triptych) drawBar(x, top int, diverging bool) {
	s := scale{1, diverging}
	for y := range panelH {
		v := 1 - (float64(y)+0.5)/panelH
		if diverging {
			v = 2*v - 1
		}
		t.ground.fill(image.Rect(x, top+y, x+barW, top+y+1), s.index(v))
	}
	t.ground.frame(image.Rect(x, top, x+barW, top+panelH), greys)
}

// barText writes the numbers of a colour bar.
func (t *triptych) barText(c canvas, x, top int, s scale) {
	lo := 0.0
	if s.diverging {
		lo = -s.top
	}
	at := ticks(lo, s.top, 5)
	text, power := t.num.tickText(at)
	for i, v := range at {
		y := top + panelH - 1 - int((v-lo)/(s.top-lo)*(panelH-1)+0.5)
		c.fill(image.Rect(x+barW, y, x+barW+6, y+1), greys)
		c.text(t.small, text[i], x+barW+10, y+7, left)
	}
	unit := t.unit
	if power != 0 {
		unit = "10" + superscript(power) + " " + unit
	}
	c.text(t.small, unit, x-4, top+panelH+53, left)
}

// panels are the three maps of one method, J × K, NaN missing.
type panels struct {
	measured, model, residual []float64
	scale, residualScale      float64
}

// triptychText is what stands above a picture.
type triptychText struct {
	id   string
	what string // right of the id, small
}

// draw paints one bottle. ps has one entry a method, at least one.
func (t *triptych) draw(text triptychText, ps []panels) canvas {
	c := newCanvas(t.ground.Rect.Dx(), t.ground.Rect.Dy())
	copy(c.Pix, t.ground.Pix)
	what := t.small.fit(plain(text.what), 900)
	c.text(t.small, what, triW-16, 38, right)
	c.text(t.head, t.head.fit(plain(text.id), triW-60-t.small.width(what)), 18, 38, left)
	for m, p := range ps {
		maps, top := t.maps[m], triHead+m*triRow+rowTitle
		s, r := scale{p.scale, false}, scale{p.residualScale, true}
		maps[0].drawTo(c, p.measured, s)
		if p.model != nil {
			maps[1].drawTo(c, p.model, s)
			maps[2].drawTo(c, p.residual, r)
			t.markHottest(c, maps[2], p.residual)
		}
		t.barText(c, triBarX, top, s)
		t.barText(c, triResBar, top, r)
	}
	return c
}

// markHottest rings the largest residual.
func (t *triptych) markHottest(c canvas, m *mapping, residual []float64) {
	if i := largest(residual); i >= 0 {
		k := t.grid.Em.Len()
		c.ring(m.x(t.grid.Em.At(i%k)), m.y(t.grid.Ex.At(i/k)), m.r)
	}
}

// largest returns where |v| is largest, -1 where there is no number.
func largest(v []float64) int {
	at := -1
	for i, x := range v {
		if x == x && (at < 0 || math.Abs(x) > math.Abs(v[at])) {
			at = i
		}
	}
	return at
}

// newPanels splits a sample into the maps of one method and sets their scales:
// the maximum up to which all but the largest 0.1 % of cells lie, for residuals
// (all but 0.5 %) at least 1 % of that, so that noise does not look like news.
func newPanels(s *StoreSample, method string) panels {
	p := panels{measured: s.Corrected}
	p.scale = ceilNice(topOf(s.Corrected, 0.999))
	p.residualScale = ceilNice(p.scale / 100)
	r, ok := s.Residual[method]
	if !ok {
		return p
	}
	p.model, p.residual = make([]float64, len(r)), make([]float64, len(r))
	abs := make([]float64, len(r))
	for i, v := range r {
		p.residual[i] = float64(v)
		p.model[i] = s.Corrected[i] - float64(v)
		abs[i] = math.Abs(float64(v))
	}
	p.residualScale = ceilNice(max(p.scale/100, topOf(abs, 0.995)))
	return p
}

// topOf returns the q-quantile of the numbers in v, 0 where there are none.
func topOf(v []float64, q float64) float64 {
	n := make([]float64, 0, len(v))
	for _, x := range v {
		if x == x && !math.IsInf(x, 0) {
			n = append(n, x)
		}
	}
	if len(n) == 0 {
		return 0
	}
	slices.Sort(n)
	return n[int(q*float64(len(n)-1))]
}

// fitText describes a fit in words for the head of a picture.
func (n numbers) fitText(explained, rms, noise float64, unit string) string {
	s := fmt.Sprintf("explained %s %% · residual rms %s %s", n.sig(explained, 4), n.sig(rms, 2), unit)
	if noise == noise {
		s += fmt.Sprintf(", noise %s %s", n.sig(noise, 2), unit)
	}
	return s
}
