package report

import (
	"errors"
	"fmt"
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/unmix"
)

// PlanDrawing is what the pictures of a plan show. Percentages are relative standard
// uncertainties, NaN where scans do not tell the components apart.
type PlanDrawing struct {
	Set     *unmix.Set
	Apart   []bool     // of the set: kept apart, value not asked for; nil: none
	Worst   bool       // the criterion is the largest of the components, not their root mean square
	Lines   []PlanLine // by number of scans; the last one is all scans of the grid
	Drawn   int        // of Lines: whose excitations are drawn over the references
	Decimal string     // "comma" for a decimal comma
}

// PlanLine is one plan.
type PlanLine struct {
	Excitations []float64 // nm
	Emission    [2]float64
	Minutes     float64
	Criterion   float64   // percent
	Components  []float64 // percent, in the order of the set
}

// criterion names what is made small.
func (d *PlanDrawing) criterion() string {
	if d.Worst {
		return "largest of them"
	}
	return "all together"
}

// PlanFigures writes plan-tradeoff and plan-lines, each as SVG, PNG and CSV, to dir.
func PlanFigures(dir string, d PlanDrawing) error {
	n := numbers{d.Decimal == "comma"}
	return errors.Join(n.planTradeOff(&d).write(dir), n.planLines(&d).write(dir))
}

// planTradeOff draws what more scans bring, by their number and by the time they take.
func (n numbers) planTradeOff(d *PlanDrawing) *figure {
	num := &Table{Columns: []string{"scans", "minutes", "component", "relative_percent"}}
	for _, l := range d.Lines {
		for f, v := range l.Components {
			num.Append(len(l.Excitations), l.Minutes, d.Set.Components[f].Name, v)
		}
		num.Append(len(l.Excitations), l.Minutes, d.criterion(), l.Criterion)
	}
	a, b := n.planByScans(d), n.planByMinutes(d)
	var key []keyEntry
	for f, c := range d.Set.Components {
		style := planLine(f)
		key = append(key, keyEntry{word: plain(c.Name), line: &style})
	}
	key = append(key, keyEntry{word: d.criterion(), line: &planTogether})
	f := &figure{name: "plan-tradeoff", numbers: num,
		caption: "Predicted relative standard uncertainty of each component by number of scans (rings at the right end: all scans of the grid), and the criterion by instrument time; the plan drawn over the references is marked."}
	return f.panels(2, 72*vg.Millimeter, []*plot.Plot{a, b}, key...)
}

// planLine is the line of component f.
func planLine(f int) draw.LineStyle {
	return draw.LineStyle{Color: series(f), Width: 0.9, Dashes: [][]vg.Length{solid, dashed, dotted}[f/len(seriesColours)%3]}
}

var planTogether = draw.LineStyle{Color: inkGrey, Width: 1.6, Dashes: dashed}

func (n numbers) planByScans(d *PlanDrawing) *plot.Plot {
	p := n.newPlot("What more scans bring", "Scans", "Relative standard uncertainty (%)")
	last := len(d.Lines) - 1
	x, end := make([]float64, last), float64(len(d.Lines[max(0, last-1)].Excitations))+1
	var ticks []plot.Tick
	for i := range last {
		x[i] = float64(len(d.Lines[i].Excitations))
		ticks = append(ticks, plot.Tick{Value: x[i], Label: fmt.Sprint(len(d.Lines[i].Excitations))})
	}
	ticks = append(ticks, plot.Tick{Value: end, Label: fmt.Sprintf("all %d", len(d.Lines[last].Excitations))})
	add := func(style draw.LineStyle, of func(PlanLine) float64) {
		y := make([]float64, last)
		for i := range y {
			y[i] = log10(of(d.Lines[i]))
		}
		l, marks := &curve{x: x, y: y, style: style}, &dots{radius: 1.6}
		for i := range y {
			marks.add(x[i], y[i], math.NaN(), math.NaN(), draw.CircleGlyph{}, style.Color)
		}
		marks.add(end, log10(of(d.Lines[last])), math.NaN(), math.NaN(), draw.RingGlyph{}, style.Color)
		p.Add(l, marks)
	}
	for f := range d.Set.Components {
		add(planLine(f), func(l PlanLine) float64 { return l.Components[f] })
	}
	add(planTogether, func(l PlanLine) float64 { return l.Criterion })
	p.X.Min, p.X.Max = x[0]-0.4, end+0.5
	p.X.Tick.Marker = plot.ConstantTicks(ticks)
	n.logAxis(&p.Y)
	return p
}

func (n numbers) planByMinutes(d *PlanDrawing) *plot.Plot {
	p := n.newPlot("What more time brings", "Minutes a bottle", "Relative standard uncertainty, "+d.criterion()+" (%)")
	l := &curve{style: draw.LineStyle{Color: inkGrey, Width: 0.8}}
	marks, words := &dots{radius: 2}, &labels{style: textStyle(smallPoints, inkGrey)}
	for i, line := range d.Lines {
		x, y := log10(line.Minutes), log10(line.Criterion)
		glyph, colour := draw.GlyphDrawer(draw.CircleGlyph{}), color.Color(series(0))
		if i == len(d.Lines)-1 {
			glyph = draw.RingGlyph{}
		}
		if i == d.Drawn {
			colour = series(1)
		}
		marks.add(x, y, math.NaN(), math.NaN(), glyph, colour)
		if !math.IsNaN(y) {
			words.x, words.y, words.words = append(words.x, x), append(words.y, y), append(words.words, fmt.Sprint(len(line.Excitations)))
		}
		l.x, l.y = append(l.x, x), append(l.y, y)
	}
	p.Add(l, marks, words)
	n.logAxis(&p.X)
	n.logAxis(&p.Y)
	return p
}

// log10 is NaN for what has no logarithm.
func log10(v float64) float64 {
	if !(v > 0) || math.IsInf(v, 0) {
		return math.NaN()
	}
	return math.Log10(v)
}

// logAxis marks an axis of common logarithms at 1, 2 and 5 times the powers of ten,
// with room at both ends.
func (n numbers) logAxis(a *plot.Axis) {
	if !(a.Max >= a.Min) {
		a.Min, a.Max = 0, 1
	}
	room := max(0.06*(a.Max-a.Min), 0.05)
	a.Min, a.Max = a.Min-room, a.Max+room
	var out []plot.Tick
	steps := []float64{1, 2, 5}
	if a.Max-a.Min > 2.5 {
		steps = []float64{1}
	}
	for e := math.Floor(a.Min); e <= a.Max; e++ {
		for _, s := range steps {
			if v := e + math.Log10(s); v >= a.Min && v <= a.Max {
				out = append(out, plot.Tick{Value: v, Label: n.short(s*math.Pow(10, e), 2)})
			}
		}
	}
	a.Tick.Marker = plot.ConstantTicks(out)
}

// labels writes words to the right of points.
type labels struct {
	x, y  []float64
	words []string
	style text.Style
}

// Plot implements plot.Plotter.
func (l *labels) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	for i, s := range l.words {
		c.FillText(l.style, vg.Point{X: tx(l.x[i]) + 3.5, Y: ty(l.y[i]) + 9}, s)
	}
}

// reference is the surface of component f, NaN where it takes no part.
func (d *PlanDrawing) reference(f int) []float64 {
	g := d.Set.Grid
	v := make([]float64, g.Cells())
	for j := range g.Ex.Len() {
		for k := range g.Em.Len() {
			i := g.Index(j, k)
			v[i] = math.NaN()
			if d.Set.Mask == nil || d.Set.Mask[i] {
				v[i] = d.Set.Components[f].At(g, j, k)
			}
		}
	}
	return v
}

// planLines draws the excitations of one plan over the references.
func (n numbers) planLines(d *PlanDrawing) *figure {
	g, chosen := d.Set.Grid, d.Lines[d.Drawn]
	num := &Table{Columns: []string{"component", "excitation_nm", "emission_nm", "reference", "planned"}}
	var plots []*plot.Plot
	for f := range d.Set.Components {
		c := &d.Set.Components[f]
		v := d.reference(f)
		for i, x := range v {
			ex, em := g.Ex.At(i/g.Em.Len()), g.Em.At(i%g.Em.Len())
			num.Append(c.Name, ex, em, x, slices.Contains(chosen.Excitations, ex) && em >= chosen.Emission[0] && em <= chosen.Emission[1])
		}
		p := n.newPlot(c.Name, "Emission wavelength (nm)", "Excitation wavelength (nm)")
		p.Add(&heat{g, v, scale{top: max(topOf(v, 1), math.SmallestNonzeroFloat64)}})
		for _, nm := range chosen.Excitations {
			p.Add(&scanLine{nm, chosen.Emission})
		}
		plots = append(plots, p)
	}
	cols := min(3, len(plots))
	rows := (len(plots) + cols - 1) / cols
	return &figure{name: "plan-lines", numbers: num, height: vg.Length(rows) * 56 * vg.Millimeter,
		caption: fmt.Sprintf("The %d planned scans over the references, each from pale (nothing) to dark (its highest intensity); grey cells are left out, as under scatter.", len(chosen.Excitations)),
		draw:    func(c draw.Canvas) { drawGrid(c, cols, plots) }}
}

// scanLine is an emission scan on a map: a dark line in a light one, seen on any
// colour.
type scanLine struct {
	ex float64
	em [2]float64
}

// Plot implements plot.Plotter.
func (s *scanLine) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	y := ty(s.ex)
	for _, l := range []draw.LineStyle{{Color: color.White, Width: 2.2}, {Color: series(1), Width: 1.1}} {
		c.StrokeLine2(l, tx(max(p.X.Min, s.em[0])), y, tx(min(p.X.Max, s.em[1])), y)
	}
}
