package report

import (
	"image/color"
	"math"
	"slices"
	"strings"
	"time"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// parseDay reads an ISO 8601 date or time.
func parseDay(s string) (time.Time, bool) {
	for _, layout := range []string{"2006-01-02", "2006-01-02 15:04", "2006-01-02T15:04", "2006-01-02 15:04:05", "2006-01-02T15:04:05", time.RFC3339} {
		if t, err := time.Parse(layout, strings.TrimSpace(s)); err == nil {
			return t, true
		}
	}
	return time.Time{}, false
}

// places says where every bottle stands on the axis of a survey figure.
type places struct {
	name   string // of the figure: site, date, order
	label  string // of the axis
	x      []float64
	ticks  []plot.Tick
	lo, hi float64
}

// bySite places bottles in one strip a site, in the order of first appearance;
// within a strip they stand side by side, so that none hides another.
func (r *results) bySite() *places {
	t := r.table["samples.csv"]
	site := t.Col("site")
	p := &places{name: "site", label: "Site", x: make([]float64, len(r.bottles)), lo: -0.5}
	members := map[string][]int{}
	var order []string
	for i, b := range r.bottles {
		p.x[i] = math.NaN()
		s := t.Text(b.row, site)
		if s == "" {
			continue
		}
		if members[s] == nil {
			order = append(order, s)
		}
		members[s] = append(members[s], i)
	}
	if len(order) < 2 || len(order) > 40 {
		return nil
	}
	for k, s := range order {
		for j, i := range members[s] {
			p.x[i] = float64(k) + 0.7*((float64(j)+0.5)/float64(len(members[s]))-0.5)
		}
		p.ticks = append(p.ticks, plot.Tick{Value: float64(k), Label: plain(s)})
	}
	p.hi = float64(len(order)) - 0.5
	return p
}

// byDate places bottles on a time axis.
func (r *results) byDate() *places {
	t := r.table["samples.csv"]
	for _, name := range []string{"sampled", "measured"} {
		col := t.Col(name)
		p := &places{name: "date", label: "Date " + name, x: make([]float64, len(r.bottles)), lo: math.Inf(1), hi: math.Inf(-1)}
		for i, b := range r.bottles {
			p.x[i] = math.NaN()
			if d, ok := parseDay(t.Text(b.row, col)); ok {
				p.x[i] = float64(d.Unix()) / 86400
				p.lo, p.hi = min(p.lo, p.x[i]), max(p.hi, p.x[i])
			}
		}
		if p.hi > p.lo {
			if p.hi-p.lo < 10 { // whole days
				p.lo, p.hi = math.Floor(p.lo), math.Ceil(p.hi)
			}
			pad := (p.hi - p.lo) * 0.03
			p.ticks = dayTicks(p.lo, p.hi)
			p.lo, p.hi = p.lo-pad, p.hi+pad
			return p
		}
	}
	return nil
}

// dayTicks marks whole days, at most about 8 of them.
func dayTicks(lo, hi float64) []plot.Tick {
	step := max(1, math.Ceil((hi-lo)/8))
	var out []plot.Tick
	for d := math.Ceil(lo); d <= hi; d += step {
		out = append(out, plot.Tick{Value: d, Label: time.Unix(int64(d)*86400, 0).UTC().Format("2006-01-02")})
	}
	return out
}

// inOrder places bottles as the run sheet lists them.
func (r *results) inOrder() *places {
	p := &places{name: "order", label: "Bottle, in the order of the run sheet", x: make([]float64, len(r.bottles)),
		lo: 0, hi: float64(len(r.bottles)) + 1}
	for i := range p.x {
		p.x[i] = float64(i + 1)
	}
	for _, v := range ticks(1, max(p.hi, 9), 8) { // whole steps
		p.ticks = append(p.ticks, plot.Tick{Value: v, Label: r.num.fixed(v, 0)})
	}
	return p
}

// labelLast leaves the words on the axis to the last of the plots that stand above
// one another, and turns them where they would touch.
func (at *places) labelLast(plots []*plot.Plot) {
	bare := slices.Clone(at.ticks)
	for i := range bare {
		bare[i].Label = " " // a tick without a label would count as a minor one
	}
	last := plots[len(plots)-1]
	for _, p := range plots[:len(plots)-1] {
		p.X.Label.Text = ""
		p.X.Tick.Marker = plot.ConstantTicks(bare)
	}
	if longestLabel(at.ticks)*len(at.ticks) > 105 { // letters that fit side by side on the width of the figure
		last.X.Tick.Label.Rotation = math.Pi / 5
		last.X.Tick.Label.XAlign, last.X.Tick.Label.YAlign = draw.XRight, draw.YTop
	}
}

// figContributions draws a method's contributions across the survey.
func (r *results) figContributions(method string, at *places) *figure {
	if at == nil {
		return nil
	}
	num := &Table{Columns: []string{"id", "place", "component", "value", "lower95", "upper95", "unit", "qualifier"}}
	var plots []*plot.Plot
	for _, s := range r.series {
		if s.method != method {
			continue
		}
		if p := r.contributionPanel(s, at, num); p != nil {
			plots = append(plots, p)
		}
	}
	if len(plots) == 0 {
		return nil
	}
	at.labelLast(plots)
	f := &figure{name: "contributions-" + method + "-by-" + at.name, numbers: num,
		caption: "Contributions (" + methodName(method) + ") with 95 % intervals: filled circles found, open circles not detected, triangles unreliable (J); unusable bottles are left out; dashed: median detection limit."}
	return f.panels(1, 34*vg.Millimeter, plots,
		keyEntry{word: "found", glyph: draw.CircleGlyph{}, color: series(0)},
		keyEntry{word: "not detected", glyph: draw.RingGlyph{}, color: series(0)},
		keyEntry{word: "unreliable (J)", glyph: draw.PyramidGlyph{}, color: series(1)},
		keyEntry{word: "95 % interval", line: &draw.LineStyle{Color: series(0), Width: 0.5}},
		keyEntry{word: "median detection limit", line: &limitLine})
}

var limitLine = draw.LineStyle{Color: hatchGrey, Width: 0.7, Dashes: dashed}

// contributionPanel draws one component and adds its numbers to num; nil where
// nothing can be used.
func (r *results) contributionPanel(s *column, at *places, num *Table) *plot.Plot {
	d := &dots{radius: 1.7}
	var limits []float64
	for i, c := range s.rows {
		if c == nil || math.IsNaN(at.x[i]) || !r.bottles[i].reportable() {
			continue
		}
		num.Append(r.bottles[i].id, at.x[i], s.component, c.value, c.lower, c.upper, s.unit, c.qualifier)
		if c.qualifier == "R" {
			continue
		}
		glyph, colour := qualifierMark(c.qualifier)
		d.add(at.x[i], c.value, c.lower, c.upper, glyph, colour)
		if !math.IsNaN(c.limit) {
			limits = append(limits, c.limit)
		}
	}
	if len(d.x) == 0 {
		return nil
	}
	p := r.num.newPlot(s.component, at.label, s.unit)
	p.Y.Min, p.Y.Max = 0, 0
	p.X.Tick.Marker = plot.ConstantTicks(at.ticks)
	p.Add(d)
	if len(limits) > 0 {
		slices.Sort(limits)
		p.Add(&levelLine{at: limits[len(limits)/2], style: limitLine})
	}
	p.X.Min, p.X.Max = at.lo, at.hi
	p.Y.Max = ceilNice(p.Y.Max * 1.02)
	return p
}

// qualifierMark tells qualifiers apart by shape and colour.
func qualifierMark(q string) (draw.GlyphDrawer, color.Color) {
	switch q {
	case "U":
		return draw.RingGlyph{}, series(0)
	case "J":
		return draw.PyramidGlyph{}, series(1)
	}
	return draw.CircleGlyph{}, series(0)
}
