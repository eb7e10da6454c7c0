package report

import (
	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// maxBlankPanels is how many contaminated blanks are drawn; blanks.csv has them all.
const maxBlankPanels = 8

// figBlanks draws the spectra of contaminated blanks beside those of the other blanks
// of their batch; nil where no blank is doubtful.
func (r *results) figBlanks() *figure {
	t := r.table["blanks.csv"]
	num := &Table{Columns: t.Columns}
	var plots []*plot.Plot
	ids, rows := t.groups("id")
	for _, id := range ids {
		if len(plots) == 2*maxBlankPanels || !t.Bool(rows[id][0], t.Col("doubtful")) {
			continue
		}
		for _, mode := range []string{"excitation", "emission"} {
			if p := r.blankPanel(id, mode, rows[id]); p != nil {
				plots = append(plots, p)
			}
		}
		for _, i := range rows[id] {
			num.Rows = append(num.Rows, t.Rows[i])
		}
	}
	if len(plots) == 0 {
		return nil
	}
	f := &figure{name: "blanks", numbers: num,
		caption: "Contaminated blanks: spectra through the brightest spot, in percent of the blank's own Raman line; dashed the mean of the batch's other blanks, gaps where scatter was cut out."}
	return f.panels(2, 48*vg.Millimeter, plots, keyEntry{word: "the blank", line: &blankLine}, keyEntry{word: "other blanks", line: &otherBlanks})
}

var (
	blankLine   = draw.LineStyle{Color: series(3), Width: 1}
	otherBlanks = draw.LineStyle{Color: inkGrey, Width: 0.8, Dashes: dashed}
)

// blankPanel draws one spectrum of a blank; nil where it has no numbers.
func (r *results) blankPanel(id, mode string, rows []int) *plot.Plot {
	t := r.table["blanks.csv"]
	var nm, own, others []float64
	at := ""
	for _, i := range rows {
		if t.Text(i, t.Col("mode")) != mode {
			continue
		}
		at = r.num.nm(t.Float(i, t.Col("at_nm")))
		nm = append(nm, t.Float(i, t.Col("wavelength_nm")))
		own, others = append(own, t.Float(i, t.Col("percent"))), append(others, t.Float(i, t.Col("others_percent")))
	}
	other := map[string]string{"excitation": "em", "emission": "ex"}[mode]
	p := r.num.newPlot(id+", "+mode+" at "+other+" "+at+" nm", "Wavelength (nm)", "% of the Raman line")
	p.Add(&curve{x: nm, y: own, style: blankLine}, &curve{x: nm, y: others, style: otherBlanks})
	if !(p.Y.Max > p.Y.Min) {
		return nil
	}
	p.Y.Max += 0.05 * (p.Y.Max - p.Y.Min)
	return p
}
