package report

import (
	"fmt"
	"image/color"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// figModels draws what speaks for and against each number of components.
func (r *results) figModels() *figure {
	t := r.table["models.csv"]
	if len(t.Rows) < 2 {
		return nil
	}
	k, chosen := t.floats("components"), math.NaN()
	agree, starts := t.floats("starts_agreeing"), t.floats("starts")
	for i := range k {
		agree[i] *= 100 / starts[i]
		if t.Bool(i, t.Col("chosen")) {
			chosen = k[i]
		}
	}
	ex, em, core, nan := t.floats("split_half_excitation"), t.floats("split_half_emission"), t.floats("core_consistency"), math.NaN()
	var plots []*plot.Plot
	for _, m := range []modelPanel{
		{title: "Explained", y: "% of the sum of squares", lo: nan, hi: 100.4, limit: nan, v: [][]float64{t.floats("explained_percent")}},
		{title: "Core consistency", y: "%", lo: min(0, minOf(core)), hi: 104, limit: nan, v: [][]float64{core}},
		{title: "Split halves: excitation (solid), emission (dashed)", y: "Lowest congruence", lo: min(0.5, minOf(ex), minOf(em)) - 0.02, hi: 1.01, limit: 0.95, v: [][]float64{ex, em}},
		{title: "Starts that reached the best fit", y: "%", lo: 0, hi: 104, limit: nan, v: [][]float64{agree}},
	} {
		if p := r.drawModelPanel(m, k, chosen); p != nil {
			plots = append(plots, p)
		}
	}
	if len(plots) == 0 {
		return nil
	}
	f := &figure{name: "models", numbers: &Table{Columns: t.Columns, Rows: t.Rows},
		caption: "Choosing the number of components; the grey bar marks the number chosen, dotted lines the limits. Why each number passed or failed stands in models.csv."}
	return f.panels(2, 50*vg.Millimeter, plots, keyEntry{word: "number chosen", line: &chosenBar}, keyEntry{word: "limit", line: &modelLimit})
}

// modelPanel is one figure of merit against the number of components.
type modelPanel struct {
	title, y      string
	lo, hi, limit float64 // NaN: from the data, none
	v             [][]float64
}

// drawModelPanel draws m over the numbers k; nil where it has no numbers.
func (r *results) drawModelPanel(m modelPanel, k []float64, chosen float64) *plot.Plot {
	p := r.num.newPlot(m.title, "Components", m.y)
	none := math.NaN()
	for i, v := range m.v {
		l := &curve{x: k, y: v, style: draw.LineStyle{Color: series(i), Width: 1, Dashes: [][]vg.Length{solid, dashed}[i%2]}}
		d := &dots{radius: 2}
		for n := range k {
			d.add(k[n], v[n], none, none, []draw.GlyphDrawer{draw.CircleGlyph{}, draw.SquareGlyph{}}[i%2], series(i))
		}
		p.Add(l, d)
	}
	p.Add(&levelLine{at: chosen, up: true, style: chosenBar}, &levelLine{at: m.limit, style: modelLimit})
	p.X.Min, p.X.Max = k[0]-0.4, k[len(k)-1]+0.4
	p.X.Tick.Marker = wholeTicks(k)
	if !(p.Y.Max >= p.Y.Min) {
		return nil
	}
	p.Y.Max = m.hi
	if p.Y.Min -= 0.06 * (p.Y.Max - p.Y.Min); !math.IsNaN(m.lo) {
		p.Y.Min = m.lo
	}
	return p
}

var (
	chosenBar  = draw.LineStyle{Color: color.NRGBA{60, 60, 70, 60}, Width: 6}
	modelLimit = draw.LineStyle{Color: inkGrey, Width: 0.5, Dashes: dotted}
)

func minOf(v []float64) float64 { lo, _ := bounds(v); return lo }

// wholeTicks marks the numbers given.
func wholeTicks(at []float64) plot.Ticker {
	var out []plot.Tick
	for _, v := range at {
		out = append(out, plot.Tick{Value: v, Label: fmt.Sprintf("%.0f", v)})
	}
	return plot.ConstantTicks(out)
}

// half names one spectrum of a half.
type half struct{ component, mode, split, half string }

// halves reads the spectra of the chosen model's halves, in the order of the file.
func (r *results) halves(num *Table) (order []half, lines map[half]*line) {
	t := r.table["split_spectra.csv"]
	col := func(name string) int { return t.Col(name) }
	want := r.chosenComponents()
	lines = map[half]*line{}
	for i, row := range t.Rows {
		if want != "" && t.Text(i, col("components")) != want {
			continue
		}
		num.Rows = append(num.Rows, row)
		h := half{t.Text(i, col("component")), t.Text(i, col("mode")), t.Text(i, col("split")), t.Text(i, col("half"))}
		l := lines[h]
		if l == nil {
			l = &line{}
			lines[h] = l
			order = append(order, h)
		}
		l.nm, l.v = append(l.nm, t.Float(i, col("wavelength_nm"))), append(l.v, t.Float(i, col("loading")))
	}
	return order, lines
}

// figSplits lays the spectra of the halves over one another: a row a component, a
// colour a split, the second half dashed.
func (r *results) figSplits() *figure {
	num := &Table{Columns: r.table["split_spectra.csv"].Columns}
	order, lines := r.halves(num)
	var names, splits []string
	panel := map[[2]string]*plot.Plot{} // by component and mode
	for _, h := range order {
		at := [2]string{h.component, h.mode}
		if panel[at] == nil {
			panel[at] = r.num.newPlot(h.component+": "+h.mode, "Wavelength (nm)", "Relative intensity")
			panel[at].Y.Min, panel[at].Y.Max = 0, 1.08
		}
		if !slices.Contains(names, h.component) {
			names = append(names, h.component)
		}
		if !slices.Contains(splits, h.split) {
			splits = append(splits, h.split)
		}
		dashes := solid
		if h.half == "second" {
			dashes = dashed
		}
		panel[at].Add(&curve{x: lines[h].nm, y: lines[h].v, style: draw.LineStyle{Color: series(slices.Index(splits, h.split)), Width: 0.8, Dashes: dashes}})
		panel[at].Y.Min, panel[at].Y.Max = 0, 1.08
	}
	if len(names) == 0 {
		return nil
	}
	var plots []*plot.Plot
	for _, name := range names {
		for _, mode := range []string{"excitation", "emission"} {
			if p := panel[[2]string{name, mode}]; p != nil {
				plots = append(plots, p)
			}
		}
	}
	key := []keyEntry{{word: "first half", line: &draw.LineStyle{Color: inkGrey, Width: 0.8}}, {word: "second half", line: &draw.LineStyle{Color: inkGrey, Width: 0.8, Dashes: dashed}}}
	for n, s := range splits {
		key = append(key, keyEntry{word: s, line: &draw.LineStyle{Color: series(n), Width: 1.6}})
	}
	f := &figure{name: "splits", numbers: num, caption: "Split halves laid over one another: spectra of the model fitted to independent halves of the bottles; a gap where the model of all bottles leaves a loading open."}
	return f.panels(2, 40*vg.Millimeter, plots, key...)
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
