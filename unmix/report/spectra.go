package report

import (
	"fmt"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// line is a spectrum: loadings, NaN where undetermined, with standard
// uncertainties (NaN where unknown).
type line struct {
	nm, v, u []float64
	open     []float64 // the loadings as they are written, also where undetermined
}

// component is one component of the model that the results rest on.
type component struct {
	name   string
	ex, em line
}

// components reads the chosen spectra of a method, in the order of the file.
func (r *results) components(method string) []*component {
	t := r.table["components.csv"]
	name, mode, nm, v, u := t.Col("component"), t.Col("mode"), t.Col("wavelength_nm"), t.Col("loading"), t.Col("standard_uncertainty")
	det, meth, chosen := t.Col("determined"), t.Col("method"), t.Col("chosen")
	var out []*component
	byName := map[string]*component{}
	for i := range t.Rows {
		if t.Text(i, meth) != method || (!t.Bool(i, chosen) && method != "unexplained") {
			continue
		}
		c := byName[t.Text(i, name)]
		if c == nil {
			c = &component{name: t.Text(i, name)}
			byName[c.name] = c
			out = append(out, c)
		}
		l := &c.em
		switch t.Text(i, mode) {
		case "excitation":
			l = &c.ex
		case "emission":
		default: // the scale of a reference is no spectrum
			continue
		}
		loading := t.Float(i, v)
		l.open = append(l.open, loading)
		if t.Text(i, det) == "false" {
			loading = math.NaN()
		}
		l.nm, l.v, l.u = append(l.nm, t.Float(i, nm)), append(l.v, loading), append(l.u, t.Float(i, u))
	}
	return out
}

// peak is the wavelength of the largest loading, NaN where the data leave it open.
// The maximum is 1: a spectrum without a loading near 1 lacks its peak.
func (l *line) peak() float64 {
	at := -1
	for i, v := range l.open {
		if v == v && (at < 0 || v > l.open[at]) {
			at = i
		}
	}
	if at < 0 || !(l.v[at] > 0.9) {
		return math.NaN()
	}
	return l.nm[at]
}

// surface returns the product of both spectra on their own axes, NaN where emission
// is not longer than excitation; ok is false where they do not form a grid, or one of
// a single excitation, whose spectrum says all.
func (c *component) surface() (g eem.Grid, v []float64, ok bool) {
	var err1, err2 error
	g.Ex, err1 = eem.NewAxis(c.ex.nm)
	g.Em, err2 = eem.NewAxis(c.em.nm)
	if err1 != nil || err2 != nil || oneScan(g) {
		return g, nil, false
	}
	v = make([]float64, 0, g.Cells())
	for j, x := range c.ex.v {
		for k, m := range c.em.v {
			if c.em.nm[k] <= c.ex.nm[j] {
				m = math.NaN()
			}
			v = append(v, x*m)
		}
	}
	return g, v, true
}

// peakText is the component's name with the peaks of its spectra; where both are
// greatest is no peak where nothing fluoresces: then with that of what can be seen.
func (r *results) peakText(c *component) string {
	own, seen := unmix.Peak(c.ex.nm, c.em.nm, c.ex.open, c.em.open)
	if own != seen && seen[0] >= 0 {
		return fmt.Sprintf("%s  (seen peak ex %s, em %s nm)", c.name, r.num.nm(c.ex.nm[seen[0]]), r.num.nm(c.em.nm[seen[1]]))
	}
	word := func(mode string, l *line) string {
		if at := l.peak(); finite(at) {
			return mode + " " + r.num.nm(at)
		}
		return mode + " peak undetermined"
	}
	text := word("ex", &c.ex) + ", " + word("em", &c.em)
	if finite(c.ex.peak()) || finite(c.em.peak()) {
		text += " nm"
	}
	return fmt.Sprintf("%s  (%s)", c.name, text)
}

var (
	solid  []vg.Length
	dashed = []vg.Length{3.5, 2}
	dotted = []vg.Length{1, 1.6}
)

// figSpectra draws the spectra of a method's components, one panel each.
func (r *results) figSpectra(method string) *figure {
	cs := r.components(method)
	if len(cs) == 0 {
		return nil
	}
	num := &Table{Columns: []string{"component", "mode", "wavelength_nm", "loading", "standard_uncertainty"}}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, c := range cs {
		for _, l := range []struct {
			mode string
			*line
		}{{"excitation", &c.ex}, {"emission", &c.em}} {
			if a, b := bounds(l.nm); b > a { // a single excitation is no range
				lo, hi = min(lo, a), max(hi, b)
			}
			for i := range l.nm {
				num.Append(c.name, l.mode, l.nm[i], l.v[i], l.u[i])
			}
		}
	}
	var plots []*plot.Plot
	for _, c := range cs {
		p := r.num.newPlot(r.peakText(c), "Wavelength (nm)", "Relative intensity")
		p.Add(r.spectrum(&c.em, emissionLine))
		if len(c.ex.nm) > 1 {
			p.Add(r.spectrum(&c.ex, excitationLine))
		}
		p.X.Min, p.X.Max, p.Y.Min, p.Y.Max = lo, hi, 0, 1.08
		plots = append(plots, p)
	}
	f := &figure{name: "components-" + method, numbers: num,
		caption: "Spectra of the components (" + methodName(method) + "): excitation dashed, emission solid, bands of two standard uncertainties; gaps where the data leave a loading open."}
	key := []keyEntry{{word: "excitation", line: &excitationLine}, {word: "emission", line: &emissionLine},
		{word: "two standard uncertainties", line: &draw.LineStyle{Color: faint(series(1)), Width: 6}}}
	if len(cs[0].ex.nm) == 1 {
		key = key[1:]
	}
	return f.panels(2, 48*vg.Millimeter, plots, key...)
}

var (
	excitationLine = draw.LineStyle{Color: series(0), Width: 1, Dashes: dashed}
	emissionLine   = draw.LineStyle{Color: series(1), Width: 1.1}
)

func (r *results) spectrum(l *line, style draw.LineStyle) *curve {
	half := make([]float64, len(l.u))
	for i, u := range l.u {
		half[i] = 2 * u
	}
	return &curve{x: l.nm, y: l.v, half: half, style: style}
}

// figComponentMaps draws every component as a contour map.
func (r *results) figComponentMaps(method string) *figure {
	num := &Table{Columns: []string{"component", "excitation_nm", "emission_nm", "relative_intensity"}}
	var plots []*plot.Plot
	for _, c := range r.components(method) {
		g, v, ok := c.surface()
		if !ok {
			continue
		}
		p := r.num.newPlot(c.name, "Emission wavelength (nm)", "Excitation wavelength (nm)")
		p.Add(&heat{g, v, scale{1, false}}, &contour{g, v, []float64{0.1, 0.3, 0.5, 0.7, 0.9}, onMap})
		plots = append(plots, p)
		for i, x := range v {
			num.Append(c.name, g.Ex.At(i/g.Em.Len()), g.Em.At(i%g.Em.Len()), x)
		}
	}
	if len(plots) == 0 {
		return nil
	}
	cols := min(3, len(plots))
	rows := (len(plots) + cols - 1) / cols
	return &figure{name: "component-maps-" + method, numbers: num, height: vg.Length(rows)*54*vg.Millimeter + 12*vg.Millimeter,
		caption: "The components as maps (" + methodName(method) + "): product of the two spectra, maximum 1, contours at 0.1, 0.3, 0.5, 0.7 and 0.9; grey where a loading is undetermined.",
		draw: func(c draw.Canvas) {
			drawGrid(draw.Crop(c, 0, 0, 12*vg.Millimeter, 0), cols, plots)
			r.num.drawScale(draw.Crop(c, 45*vg.Millimeter, -45*vg.Millimeter, 2*vg.Millimeter, -c.Max.Y+11*vg.Millimeter), scale{1, false}, "Relative intensity")
		}}
}

// drawScale draws a colour bar lying on its side with its numbers below.
func (n numbers) drawScale(c draw.Canvas, s scale, label string) {
	const steps = 100
	lo := 0.0
	if s.diverging {
		lo = -s.top
	}
	w, top := c.Max.X-c.Min.X, c.Max.Y
	const thick = 6
	for i := range steps {
		x := c.Min.X + w*vg.Length(i)/steps
		v := lo + (float64(i)+0.5)/steps*(s.top-lo)
		c.FillPolygon(mapPalette[s.index(v)], []vg.Point{{X: x, Y: top - thick}, {X: x + w/steps + 0.3, Y: top - thick}, {X: x + w/steps + 0.3, Y: top}, {X: x, Y: top}})
	}
	at := ticks(lo, s.top, max(2, min(6, int(w/30))))
	words, power := n.tickText(at)
	st := textStyle(smallPoints, inkGrey)
	st.XAlign = draw.XCenter
	for i, v := range at {
		x := c.Min.X + w*vg.Length((v-lo)/(s.top-lo))
		c.StrokeLine2(draw.LineStyle{Color: inkGrey, Width: 0.5}, x, top-thick, x, top-thick-2.5)
		c.FillText(st, vg.Point{X: x, Y: top - thick - 3}, words[i])
	}
	if power != 0 {
		label += " · 10" + superscript(-power)
	}
	c.FillText(st, vg.Point{X: (c.Min.X + c.Max.X) / 2, Y: top - thick - 11}, label)
}
