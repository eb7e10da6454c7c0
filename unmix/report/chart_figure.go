package report

import (
	"fmt"
	"math"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// panelsPerFigure is how many quality charts fit on a page under one another.
const panelsPerFigure = 16

// figCharts draws the quality charts, one panel a variable, two side by side.
func (r *results) figCharts() []*figure {
	t := r.table["charts.csv"]
	names, rows := t.groups("variable")
	var plots []*plot.Plot
	for _, name := range names {
		if p := r.qualityPanel(name, rows[name]); p != nil {
			plots = append(plots, p)
		}
	}
	var out []*figure
	for n := 0; n < len(plots); n += panelsPerFigure {
		f := &figure{name: "charts", numbers: &Table{Columns: t.Columns, Rows: t.Rows},
			caption: "Quality charts: solid the value expected, dashed the warning limits, dotted the action limits; crosses break a rule."}
		if n > 0 {
			f.name = fmt.Sprintf("charts-%d", n/panelsPerFigure+1)
		}
		out = append(out, f.panels(2, 30*vg.Millimeter, plots[n:min(len(plots), n+panelsPerFigure)],
			keyEntry{word: "found", glyph: draw.CircleGlyph{}, color: series(0)},
			keyEntry{word: "breaks a rule", glyph: draw.CrossGlyph{}, color: series(3)},
			keyEntry{word: "expected", line: &chartLimits[0].style},
			keyEntry{word: "warning limit", line: &chartLimits[1].style},
			keyEntry{word: "action limit", line: &chartLimits[3].style}))
	}
	return out
}

// chartLimits are the limits of a quality chart and how they are drawn.
var chartLimits = []struct {
	column string
	style  draw.LineStyle
}{
	{"centre", draw.LineStyle{Color: inkGrey, Width: 0.6}},
	{"warn_low", draw.LineStyle{Color: series(1), Width: 0.6, Dashes: dashed}},
	{"warn_high", draw.LineStyle{Color: series(1), Width: 0.6, Dashes: dashed}},
	{"act_low", draw.LineStyle{Color: series(3), Width: 0.7, Dashes: dotted}},
	{"act_high", draw.LineStyle{Color: series(3), Width: 0.7, Dashes: dotted}},
}

// qualityPanel draws one variable; nil where it has no numbers.
func (r *results) qualityPanel(name string, rows []int) *plot.Plot {
	t := r.table["charts.csv"]
	p := r.num.newPlot(name, "", t.Text(rows[0], t.Col("unit")))
	d := &dots{radius: 2}
	var marks []plot.Tick
	last, none := "", math.NaN()
	for n, i := range rows {
		x, y := float64(n+1), t.Float(i, t.Col("value"))
		switch t.Text(i, t.Col("verdict")) {
		case "", "pass", "good":
			d.add(x, y, none, none, draw.CircleGlyph{}, series(0))
		default:
			d.add(x, y, none, none, draw.CrossGlyph{}, series(3))
		}
		if b := t.Text(i, t.Col("batch")); b != last {
			last = b
			marks = append(marks, plot.Tick{Value: x, Label: plain(b)})
		}
	}
	for len(marks) > 1 && len(marks)*(longestLabel(marks)+3) > 62 { // letters on half the width of a figure
		marks = everySecond(marks)
	}
	for _, l := range chartLimits {
		all := t.floats(l.column)
		y := make([]float64, len(rows))
		for n, i := range rows {
			y[n] = all[i]
		}
		p.Add(&steps{y: y, style: l.style})
	}
	if !(p.Y.Max >= p.Y.Min) {
		return nil
	}
	p.Add(d)
	p.X.Min, p.X.Max = 0.4, float64(len(rows))+0.6
	p.X.Tick.Marker = plot.ConstantTicks(marks)
	pad := (p.Y.Max - p.Y.Min) * 0.06
	if pad == 0 {
		pad = 1
	}
	p.Y.Min, p.Y.Max = p.Y.Min-pad, p.Y.Max+pad
	return p
}

// longestLabel is the number of letters of the longest label.
func longestLabel(t []plot.Tick) int {
	n := 0
	for _, m := range t {
		n = max(n, len([]rune(m.Label)))
	}
	return n
}

func everySecond(t []plot.Tick) []plot.Tick {
	var out []plot.Tick
	for i := 0; i < len(t); i += 2 {
		out = append(out, t[i])
	}
	return out
}

// steps draws a limit that holds for each point n + 1 from n + 0.5 to n + 1.5.
type steps struct {
	y     []float64
	style draw.LineStyle
}

// Plot implements plot.Plotter.
func (s *steps) Plot(c draw.Canvas, p *plot.Plot) {
	tx, ty := p.Transforms(&c)
	for i := 0; i < len(s.y); {
		j := i + 1
		for j < len(s.y) && s.y[j] == s.y[i] {
			j++
		}
		if y := s.y[i]; y >= p.Y.Min && y <= p.Y.Max {
			c.StrokeLine2(s.style, tx(max(p.X.Min, float64(i)+0.5)), ty(y), tx(min(p.X.Max, float64(j)+0.5)), ty(y))
		}
		i = j
	}
}

// DataRange implements plot.DataRanger.
func (s *steps) DataRange() (xmin, xmax, ymin, ymax float64) {
	ymin, ymax = bounds(s.y)
	return 1, float64(len(s.y)), ymin, ymax
}
