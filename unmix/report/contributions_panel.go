package report

import (
	"fmt"
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"tarnlight/eem"
)

// figContributions draws a method's contributions across the survey.
func (r *results) figContributions(method string, at *places) *figure {
	if at == nil {
		return nil
	}
	num := &Table{Columns: []string{"id", "place", "component", "value", "lower95", "upper95", "unit", "qualifier", "drawn_at"}}
	var plots []*plot.Plot
	logarithmic := false
	for _, s := range r.series {
		if s.method != method {
			continue
		}
		if p, l := r.contributionPanel(s, at, num); p != nil {
			plots = append(plots, p)
			logarithmic = logarithmic || l
		}
	}
	if len(plots) == 0 {
		return nil
	}
	at.labelLast(plots)
	f := &figure{name: "contributions-" + method + "-by-" + at.name, choice: at.name, numbers: num,
		caption: "Contributions (" + methodName(method) + ") with 95 % intervals: filled circles found, open circles not detected (drawn at their detection limits), triangles unreliable (J); unusable bottles are left out; dashed: median detection limit."}
	if logarithmic {
		f.caption += " An axis is logarithmic, as its title says, where half of what was found would lie in the lowest tenth of a linear one."
	}
	if n := r.without(at); n > 0 {
		f.caption += fmt.Sprintf(" Not shown: %s without a %s.", eem.Count(n, "bottle"), at.name)
	}
	return f.panels(1, 34*vg.Millimeter, plots,
		keyEntry{word: "found", glyph: draw.CircleGlyph{}, color: series(0)},
		keyEntry{word: "not detected, at its limit", glyph: draw.RingGlyph{}, color: series(0)},
		keyEntry{word: "unreliable (J)", glyph: draw.PyramidGlyph{}, color: series(1)},
		keyEntry{word: "95 % interval", line: &draw.LineStyle{Color: series(0), Width: 0.5}},
		keyEntry{word: "median detection limit", line: &limitLine})
}

// without counts the bottles to report that have no place on the axis.
func (r *results) without(at *places) int {
	n := 0
	for i, b := range r.bottles {
		if b.reportable() && math.IsNaN(at.x[i]) {
			n++
		}
	}
	return n
}

var limitLine = draw.LineStyle{Color: inkGrey, Width: 0.7, Dashes: dashed}

// contributionPanel draws one component and adds its numbers to num; nil where
// nothing can be used. It says whether the axis is logarithmic.
func (r *results) contributionPanel(s *column, at *places, num *Table) (*plot.Plot, bool) {
	d := &dots{radius: 1.7}
	if len(s.rows) > 300 {
		d.radius = 1.2
	}
	var limits, found []float64
	for i, c := range s.rows {
		if c == nil || math.IsNaN(at.x[i]) || !r.bottles[i].reportable() {
			continue
		}
		y, lo, hi := c.value, c.lower, c.upper
		if c.qualifier == "U" && !math.IsNaN(c.limit) {
			y, lo, hi = c.limit, math.NaN(), math.NaN()
		}
		num.Append(r.bottles[i].id, at.x[i], s.component, c.value, c.lower, c.upper, s.unit, c.qualifier, y)
		if c.qualifier == "R" {
			continue
		}
		glyph, colour := qualifierMark(c.qualifier)
		d.add(at.x[i], y, lo, hi, glyph, colour)
		if !math.IsNaN(c.limit) {
			limits = append(limits, c.limit)
		}
		if c.qualifier != "U" {
			found = append(found, c.value)
		}
	}
	if len(d.x) == 0 {
		return nil, false
	}
	p := r.num.newPlot(s.component, at.label, s.unit)
	p.Y.Min, p.Y.Max = 0, 0
	p.X.Tick.Marker = plot.ConstantTicks(at.ticks)
	if len(limits) > 0 {
		slices.Sort(limits)
		p.Add(&levelLine{at: limits[len(limits)/2], style: limitLine})
	}
	p.Add(d) // over the line
	p.X.Min, p.X.Max = at.lo, at.hi
	p.Y.Max = ceilNice(p.Y.Max * 1.02)
	logarithmic := unevenly(found)
	if logarithmic {
		r.logarithmic(p, d.y)
	}
	return p, logarithmic
}

// unevenly says whether a linear axis would hide what was found: half of it in the
// lowest tenth.
func unevenly(found []float64) bool {
	v := slices.Sorted(slices.Values(found))
	n := len(v)
	return n > 3 && v[n/2] > 0 && v[n-1] > 10*v[n/2]
}

// logarithmic gives a panel a logarithmic axis of whole decades around its marks; a
// mark at zero stands at its lower end.
func (r *results) logarithmic(p *plot.Plot, y []float64) {
	lo := math.Inf(1)
	for _, v := range y {
		if v > 0 {
			lo = min(lo, v)
		}
	}
	first, last := math.Floor(math.Log10(lo)), math.Ceil(math.Log10(p.Y.Max))
	first = max(first, last-8) // what lies lower stands at the end
	p.Title.Text += ", logarithmic axis"
	p.Y.Min, p.Y.Max, p.Y.Scale = math.Pow(10, first), math.Pow(10, last), plot.LogScale{}
	every := 1 + math.Floor((last-first)/5)
	var marks []plot.Tick
	for e := first; e <= last; e++ {
		m := plot.Tick{Value: math.Pow(10, e), Label: " "}
		if math.Mod(last-e, every) == 0 {
			m.Label = r.num.short(m.Value, 1)
		}
		marks = append(marks, m)
	}
	p.Y.Tick.Marker = plot.ConstantTicks(marks)
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
