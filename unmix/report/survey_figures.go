package report

import (
	"fmt"
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
	for _, v := range ticks(1, p.hi, 8) {
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
	longest := 0
	for _, t := range at.ticks {
		longest = max(longest, len([]rune(t.Label)))
	}
	if longest*len(at.ticks) > 105 { // letters that fit side by side on the width of the figure
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
		d := &dots{radius: 1.7}
		limit := []float64{}
		for i, c := range s.rows {
			if c == nil || math.IsNaN(at.x[i]) || !r.bottles[i].reportable() {
				continue
			}
			num.Append(r.bottles[i].id, at.x[i], s.component, c.value, c.lower, c.upper, s.unit, c.qualifier)
			if c.qualifier == "R" {
				continue
			}
			var g draw.GlyphDrawer = draw.CircleGlyph{}
			col := color.Color(series(0))
			switch c.qualifier {
			case "U":
				g = draw.RingGlyph{}
			case "J":
				g, col = draw.PyramidGlyph{}, series(1)
			}
			d.x, d.y = append(d.x, at.x[i]), append(d.y, c.value)
			d.lo, d.hi = append(d.lo, c.lower), append(d.hi, c.upper)
			d.glyph, d.color = append(d.glyph, g), append(d.color, col)
			if !math.IsNaN(c.limit) {
				limit = append(limit, c.limit)
			}
		}
		if len(d.x) == 0 {
			continue
		}
		p := r.num.newPlot(s.component, at.label, s.unit)
		p.X.Min, p.X.Max, p.Y.Min, p.Y.Max = at.lo, at.hi, 0, 0
		p.X.Tick.Marker = plot.ConstantTicks(at.ticks)
		p.Add(d)
		if len(limit) > 0 {
			slices.Sort(limit)
			p.Add(&levelLine{at: limit[len(limit)/2], style: draw.LineStyle{Color: hatchGrey, Width: 0.7, Dashes: dashed}})
		}
		p.X.Min, p.X.Max = at.lo, at.hi
		p.Y.Max = ceilNice(p.Y.Max * 1.02)
		plots = append(plots, p)
	}
	if len(plots) == 0 {
		return nil
	}
	at.labelLast(plots)
	return &figure{name: "contributions-" + method + "-by-" + at.name, numbers: num, height: vg.Length(len(plots)) * 34 * vg.Millimeter,
		caption: "Contributions (" + methodName(method) + ") with 95 % intervals: filled circles found, open circles not detected, triangles unreliable (J); unusable bottles are left out; dashed: median detection limit.",
		draw:    func(c draw.Canvas) { drawGrid(c, 1, plots) }}
}

// figModels draws what speaks for and against each number of components.
func (r *results) figModels() *figure {
	t := r.table["models.csv"]
	if len(t.Rows) < 2 {
		return nil
	}
	num := &Table{Columns: t.Columns, Rows: t.Rows}
	k := make([]float64, len(t.Rows))
	chosen := math.NaN()
	for i := range t.Rows {
		k[i] = t.Float(i, t.Col("components"))
		if t.Bool(i, t.Col("chosen")) {
			chosen = k[i]
		}
	}
	agree := make([]float64, len(k))
	for i := range k {
		agree[i] = 100 * t.Float(i, t.Col("starts_agreeing")) / t.Float(i, t.Col("starts"))
	}
	column := func(name string) []float64 {
		v := make([]float64, len(k))
		for i := range v {
			v[i] = t.Float(i, t.Col(name))
		}
		return v
	}
	var plots []*plot.Plot
	panel := func(title, y string, lo, hi, limit float64, names []string, vs ...[]float64) {
		p := r.num.newPlot(title, "Components", y)
		for i, v := range vs {
			l := &curve{x: k, y: v, style: draw.LineStyle{Color: series(i), Width: 1, Dashes: [][]vg.Length{solid, dashed}[i%2]}}
			d := &dots{x: k, y: v, radius: 2}
			for range k {
				d.glyph, d.color = append(d.glyph, []draw.GlyphDrawer{draw.CircleGlyph{}, draw.SquareGlyph{}}[i%2]), append(d.color, series(i))
			}
			p.Add(l, d)
			if len(names) > i {
				p.Legend.Add(names[i], l)
			}
		}
		p.Legend.Top, p.Legend.Left = false, true
		p.Add(&levelLine{at: chosen, up: true, style: draw.LineStyle{Color: color.NRGBA{60, 60, 70, 60}, Width: 6}},
			&levelLine{at: limit, style: draw.LineStyle{Color: inkGrey, Width: 0.5, Dashes: dotted}})
		p.X.Min, p.X.Max = k[0]-0.4, k[len(k)-1]+0.4
		p.X.Tick.Marker = wholeTicks(k)
		if !math.IsNaN(lo) {
			p.Y.Min = lo
		}
		if !math.IsNaN(hi) {
			p.Y.Max = hi
		}
		if !(p.Y.Max > p.Y.Min) {
			return // no numbers at all
		}
		if math.IsNaN(lo) {
			p.Y.Min -= 0.06 * (p.Y.Max - p.Y.Min)
		}
		plots = append(plots, p)
	}
	nan := math.NaN()
	panel("Explained", "% of the sum of squares", nan, 100.4, nan, nil, column("explained_percent"))
	panel("Core consistency", "%", min(0, minOf(column("core_consistency"))), 104, nan, nil, column("core_consistency"))
	panel("Split halves: lowest congruence", "Congruence", min(0.5, minOf(column("split_half_emission")), minOf(column("split_half_excitation"))), 1.01, 0.95,
		[]string{"excitation", "emission"}, column("split_half_excitation"), column("split_half_emission"))
	panel("Starts that reached the best fit", "%", 0, 104, nan, nil, agree)
	if len(plots) == 0 {
		return nil
	}
	return &figure{name: "models", numbers: num, height: vg.Length((len(plots)+1)/2) * 50 * vg.Millimeter,
		caption: "Choosing the number of components; the grey bar marks the number chosen, dotted lines the limits. Why each number passed or failed stands in models.csv.",
		draw:    func(c draw.Canvas) { drawGrid(c, 2, plots) }}
}

func minOf(v []float64) float64 { lo, _ := bounds(v); return lo }

// wholeTicks marks the numbers given.
func wholeTicks(at []float64) plot.Ticker {
	var out []plot.Tick
	for _, v := range at {
		out = append(out, plot.Tick{Value: v, Label: fmt.Sprintf("%.0f", v)})
	}
	return plot.ConstantTicks(out)
}

// figSplits lays the spectra of the halves over one another.
func (r *results) figSplits() *figure {
	t := r.table["split_spectra.csv"]
	comp, mode, nm, v := t.Col("component"), t.Col("mode"), t.Col("wavelength_nm"), t.Col("loading")
	split, half, k := t.Col("split"), t.Col("half"), t.Col("components")
	want := r.chosenComponents()
	num := &Table{Columns: t.Columns}
	type key struct{ comp, mode, split, half string }
	lines, order, names := map[key]*line{}, []key{}, []string{}
	for i, row := range t.Rows {
		if want != "" && t.Text(i, k) != want {
			continue
		}
		num.Rows = append(num.Rows, row)
		q := key{t.Text(i, comp), t.Text(i, mode), t.Text(i, split), t.Text(i, half)}
		if lines[q] == nil {
			lines[q] = &line{}
			order = append(order, q)
			if !slices.Contains(names, q.comp) {
				names = append(names, q.comp)
			}
		}
		lines[q].nm, lines[q].v = append(lines[q].nm, t.Float(i, nm)), append(lines[q].v, t.Float(i, v))
	}
	if len(names) == 0 {
		return nil
	}
	var plots []*plot.Plot
	for i, name := range names {
		p := r.num.newPlot(name, "Wavelength (nm)", "Relative intensity")
		seen := map[string]int{}
		for _, q := range order {
			if q.comp != name {
				continue
			}
			id := q.split + ", " + q.half
			n, old := seen[id]
			if !old {
				n = len(seen)
				seen[id] = n
			}
			l := &curve{x: lines[q].nm, y: lines[q].v, style: draw.LineStyle{Color: series(n), Width: 0.8, Dashes: [][]vg.Length{solid, dashed}[n%2]}}
			p.Add(l)
			if !old && i == 0 && len(seen) <= 6 {
				p.Legend.Add(id, l)
			}
		}
		p.Y.Min, p.Y.Max = 0, 1.08
		plots = append(plots, p)
	}
	return &figure{name: "splits", numbers: num, height: vg.Length((len(plots)+1)/2) * 48 * vg.Millimeter,
		caption: "Split halves laid over one another: spectra of the model fitted to independent halves of the bottles.",
		draw:    func(c draw.Canvas) { drawGrid(c, 2, plots) }}
}

// chosenComponents is the number of components of the chosen model, as written.
func (r *results) chosenComponents() string {
	t := r.table["models.csv"]
	for i := range t.Rows {
		if t.Bool(i, t.Col("chosen")) {
			return t.Text(i, t.Col("components"))
		}
	}
	return ""
}

// figCharts draws the quality charts, one panel a variable.
func (r *results) figCharts() *figure {
	t := r.table["charts.csv"]
	col := func(name string) int { return t.Col(name) }
	var names []string
	rows := map[string][]int{}
	for i := range t.Rows {
		v := t.Text(i, col("variable"))
		if rows[v] == nil {
			names = append(names, v)
		}
		rows[v] = append(rows[v], i)
	}
	if len(names) == 0 {
		return nil
	}
	var plots []*plot.Plot
	for _, name := range names {
		is := rows[name]
		p := r.num.newPlot(name, "Batch", t.Text(is[0], col("unit")))
		d := &dots{radius: 2}
		var marks []plot.Tick
		last := ""
		for n, i := range is {
			x := float64(n + 1)
			d.x, d.y = append(d.x, x), append(d.y, t.Float(i, col("value")))
			if v := t.Text(i, col("verdict")); v == "" || v == "pass" || v == "good" {
				d.glyph, d.color = append(d.glyph, draw.CircleGlyph{}), append(d.color, series(0))
			} else {
				d.glyph, d.color = append(d.glyph, draw.CrossGlyph{}), append(d.color, series(3))
			}
			if b := t.Text(i, col("batch")); b != last {
				last = b
				marks = append(marks, plot.Tick{Value: x, Label: plain(b)})
			}
		}
		for len(marks) > 14 {
			marks = everySecond(marks)
		}
		joined := &curve{x: d.x, y: d.y, style: draw.LineStyle{Color: faint(series(0)), Width: 0.6}}
		p.Add(joined, d)
		for _, l := range []struct {
			name  string
			style draw.LineStyle
		}{{"centre", draw.LineStyle{Color: inkGrey, Width: 0.6}},
			{"warn_low", draw.LineStyle{Color: series(1), Width: 0.6, Dashes: dashed}}, {"warn_high", draw.LineStyle{Color: series(1), Width: 0.6, Dashes: dashed}},
			{"act_low", draw.LineStyle{Color: series(3), Width: 0.7, Dashes: dotted}}, {"act_high", draw.LineStyle{Color: series(3), Width: 0.7, Dashes: dotted}}} {
			y := make([]float64, len(is))
			for n, i := range is {
				y[n] = t.Float(i, col(l.name))
			}
			p.Add(&steps{y: y, style: l.style})
		}
		p.X.Min, p.X.Max = 0.4, float64(len(is))+0.6
		p.X.Tick.Marker = plot.ConstantTicks(marks)
		if pad := (p.Y.Max - p.Y.Min) * 0.06; pad > 0 {
			p.Y.Min, p.Y.Max = p.Y.Min-pad, p.Y.Max+pad
		} else if p.Y.Max >= p.Y.Min {
			p.Y.Min, p.Y.Max = p.Y.Min-1, p.Y.Max+1
		} else {
			continue
		}
		plots = append(plots, p)
	}
	if len(plots) == 0 {
		return nil
	}
	for _, p := range plots[:len(plots)-1] {
		p.X.Label.Text = ""
	}
	return &figure{name: "charts", numbers: &Table{Columns: t.Columns, Rows: t.Rows}, height: vg.Length(len(plots)) * 36 * vg.Millimeter,
		caption: "Quality charts: solid the value expected, dashed the warning limits, dotted the action limits; crosses break a rule.",
		draw:    func(c draw.Canvas) { drawGrid(c, 1, plots) }}
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
