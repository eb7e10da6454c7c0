package report

import (
	"math"
	"slices"
	"strings"
	"time"

	"gonum.org/v1/plot"
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
			p.spreadDays()
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

// spreadDays puts the bottles of a day side by side, in the order of the run sheet,
// where no bottle has a time of day: one would hide all others.
func (p *places) spreadDays() {
	members := map[float64][]int{}
	for i, x := range p.x {
		if x != math.Floor(x) && !math.IsNaN(x) {
			return
		}
		members[x] = append(members[x], i)
	}
	for day, of := range members {
		for j, i := range of {
			p.x[i] = day + 0.7*((float64(j)+0.5)/float64(len(of))-0.5)
		}
	}
	p.lo, p.hi = p.lo-0.5, p.hi+0.5
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
