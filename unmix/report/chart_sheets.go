package report

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"github.com/xuri/excelize/v2"
)

// Places on the sheets with charts: the first row of the charts, and how many rows
// (of 20 pixels) one takes.
const (
	chartFirst   = 4
	qualityRows  = 16
	qualityWide  = 690 // pixels; two stand side by side
	spectraRows  = 21
	qualityHigh  = 300 // pixels
	spectraHigh  = 390
	chartColumns = 8 // that a chart of spectra covers
)

var qualityHeads = []string{"variable", "batch", "id", "measured", "value", "unit", "centre", "warn_low", "warn_high", "act_low", "act_high", "verdict", "rule"}

// qualityWords are the heads that people read; the keys of the charts take them.
var qualityWords = []string{"Variable", "Batch", "Bottle", "Measured", "found", "Unit", "expected", "warning limit, low", "warning limit, high", "action limit, low", "action limit, high", "Verdict", "Rule"}

// qualitySheet has the quality charts as native charts with their numbers.
func (r *results) qualitySheet(b *book) {
	t := r.table["charts.csv"]
	names, rows := t.groups("variable")
	if len(names) == 0 {
		return
	}
	head := chartFirst + qualityRows*((len(names)+1)/2)
	s := b.add("Quality", layout{broken: true, repeat: fmt.Sprintf("$%d:$%d", head, head), widths: []float64{34, 12, 12, 15, 11, 10, 11, 11, 11, 11, 11, 9, 26}}, func(f *excelize.File, sheet string) error {
		at := head + 1
		for k, name := range names {
			n := len(rows[name])
			c := qualityChart(sheet, plain(name), t.Text(rows[name][0], t.Col("unit")), head, at, at+n-1)
			c.Series = slices.DeleteFunc(c.Series, func(x excelize.ChartSeries) bool { return r.emptySeries(x, rows[name]) })
			r.chartRange(c, rows[name])
			row := chartFirst + qualityRows*(k/2)
			if err := f.AddChart(sheet, fmt.Sprintf("%c%d", "AG"[k%2], row), c); err != nil {
				return err
			}
			if k > 0 && k%6 == 0 { // six on a page
				if err := f.InsertPageBreak(sheet, fmt.Sprintf("A%d", row)); err != nil {
					return err
				}
			}
			at += n
		}
		return nil
	})
	s.add(20, cell{"Quality charts", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Dots: found. Lines: expected value, warning limits, action limits. The numbers stand below.", look{color: midGrey}})
	s.skip(head - s.row)
	s.add(20, uniqueHeads(qualityWords)...)
	for _, name := range names {
		for _, i := range rows[name] {
			var row []cell
			for _, h := range qualityHeads {
				c := tableCell(visible(t.Text(i, t.Col(h))))
				if h == "measured" {
					c = sheetCell("measured", t.Text(i, t.Col(h)))
				}
				row = append(row, c)
			}
			s.add(0, row...)
		}
	}
	s.done()
}

// qualityChart draws the rows from to to; the names of its lines stand in the row
// of the heads, because the library takes a name for a reference to a cell.
func qualityChart(sheet, title, unit string, head, from, to int) *excelize.Chart {
	name := func(col string) string { return fmt.Sprintf("'%s'!$%s$%d", sheet, col, head) }
	ref := func(col string) string { return fmt.Sprintf("'%s'!$%s$%d:$%s$%d", sheet, col, from, col, to) }
	line := func(col, color string, dash excelize.LineDashType) excelize.ChartSeries {
		return excelize.ChartSeries{Name: name(col), Categories: ref("B"), Values: ref(col), Marker: excelize.ChartMarker{Symbol: "none"},
			Fill: solidFill(color), Line: excelize.LineOptions{Type: excelize.LineSolid, Dash: dash, Width: 1}}
	}
	c := baseChart(excelize.Line, title, "Batch", unit)
	c.Dimension = excelize.ChartDimension{Width: qualityWide, Height: qualityHigh}
	c.Series = []excelize.ChartSeries{
		{Name: name("E"), Categories: ref("B"), Values: ref("E"), Line: excelize.LineOptions{Type: excelize.LineNone},
			Marker: excelize.ChartMarker{Symbol: "circle", Size: 6, Fill: solidFill("1F4FA8")}},
		line("G", "303030", excelize.LineDashSolid),
		line("H", "C07000", excelize.LineDashDash), line("I", "C07000", excelize.LineDashDash),
		line("J", "901818", excelize.LineDashSysDot), line("K", "901818", excelize.LineDashSysDot),
	}
	return c
}

// emptySeries says whether no row has a number for a series of a quality chart: a
// key would name a line that is not there.
func (r *results) emptySeries(x excelize.ChartSeries, rows []int) bool {
	t := r.table["charts.csv"]
	_, place, _ := strings.Cut(x.Name, "!$")
	column, _, _ := strings.Cut(place, "$")
	n, err := excelize.ColumnNameToNumber(column)
	return err == nil && !slices.ContainsFunc(rows, func(i int) bool { return finite(t.Float(i, t.Col(qualityHeads[n-1]))) })
}

// chartRange ends the axis of a quality chart a little beyond its values and
// limits: from zero on, limits a few percent apart would be one line.
func (r *results) chartRange(c *excelize.Chart, rows []int) {
	t := r.table["charts.csv"]
	var all []float64
	for _, i := range rows {
		for _, h := range []string{"value", "centre", "warn_low", "warn_high", "act_low", "act_high"} {
			all = append(all, t.Float(i, t.Col(h)))
		}
	}
	lo, hi := bounds(all)
	if !(hi > lo) {
		return
	}
	step := niceStep(hi-lo, 4)
	lo, hi = math.Floor(lo/step-0.1)*step, math.Ceil(hi/step+0.1)*step
	if low, _ := bounds(all); low >= 0 {
		lo = max(lo, 0)
	}
	c.YAxis.Minimum, c.YAxis.Maximum, c.YAxis.MajorUnit = &lo, &hi, step
}

func solidFill(color string) excelize.Fill {
	return excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{color}}
}

// baseChart is an empty chart in the style of the workbook.
func baseChart(kind excelize.ChartType, title, x, y string) *excelize.Chart {
	words := func(s string, size float64, bold bool) excelize.ChartTitle {
		return excelize.ChartTitle{Paragraph: []excelize.RichTextRun{{Text: s, Font: &excelize.Font{Family: fontName, Size: size, Bold: bold, Color: "303030"}}}}
	}
	axis := func(name string) excelize.ChartAxis {
		return excelize.ChartAxis{Title: words(name, 9, false), Font: excelize.Font{Family: fontName, Size: 9, Color: "303030"}}
	}
	return &excelize.Chart{Type: kind, Title: words(title, 11, true), XAxis: axis(x), YAxis: axis(y), ShowBlanksAs: "gap",
		Legend: excelize.ChartLegend{Position: "bottom", Font: &excelize.Font{Family: fontName, Size: 9, Color: "303030"}}, Format: excelize.GraphicOptions{AltText: title, Positioning: "oneCell"}}
}

// componentsSheet has the spectra of a method's components as native charts.
func (r *results) componentsSheet(b *book, method string) {
	cs := r.components(method)
	if len(cs) == 0 {
		return
	}
	name := "Components"
	if len(r.methods()) > 1 {
		name = cut("Components "+methodName(method), 31)
	}
	head, n := chartFirst+spectraRows, len(cs)
	s := b.add(name, layout{broken: true, repeat: fmt.Sprintf("$%d:$%d", head, head), widths: append([]float64{14}, slices.Repeat([]float64{13}, 2*n+2)...)}, func(f *excelize.File, sheet string) error {
		ex := spectraChart(sheet, "Excitation spectra", cs, 1, head+1, head+len(cs[0].ex.nm))
		em := spectraChart(sheet, "Emission spectra", cs, n+3, head+1, head+len(cs[0].em.nm))
		right, err := excelize.CoordinatesToCellName(max(n+3, chartColumns), chartFirst)
		return errors.Join(err, f.AddChart(sheet, fmt.Sprintf("A%d", chartFirst), ex), f.AddChart(sheet, right, em))
	})
	s.add(20, cell{"Components – " + methodName(method), look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Relative intensity, maximum 1; an empty cell and a gap in the line where the data leave a loading open.", look{color: midGrey}})
	s.skip(head - s.row)
	heads := spectraHeads("Excitation (nm)", cs)
	s.add(28, append(append(heads, cell{}), spectraHeads("Emission (nm)", cs)...)...)
	for i := range max(len(cs[0].ex.nm), len(cs[0].em.nm)) {
		row := append(spectraRow(i, cs, func(c *component) *line { return &c.ex }), cell{})
		s.add(rowHeight, append(row, spectraRow(i, cs, func(c *component) *line { return &c.em })...)...)
	}
	s.done()
}

func spectraHeads(wavelength string, cs []*component) []cell {
	out := []cell{{wavelength, headLook}}
	for _, c := range cs {
		out = append(out, cell{plain(c.name), headRight})
	}
	return out
}

// spectraRow is wavelength i and the components' loadings there.
func spectraRow(i int, cs []*component, of func(c *component) *line) []cell {
	row := make([]cell, 1+len(cs))
	if nm := of(cs[0]).nm; i < len(nm) {
		row[0] = cell{nm[i], look{format: "0.##"}}
	}
	for k, c := range cs {
		if v := of(c).v; i < len(v) {
			row[1+k] = cell{v[i], look{format: "0.0000"}}
		}
	}
	return row
}

// spectraChart draws the block of spectra whose wavelengths stand in column col.
func spectraChart(sheet, title string, cs []*component, col, from, to int) *excelize.Chart {
	ref := func(c, from, to int) string {
		name, _ := excelize.ColumnNumberToName(c)
		if from == to {
			return fmt.Sprintf("'%s'!$%s$%d", sheet, name, from)
		}
		return fmt.Sprintf("'%s'!$%s$%d:$%s$%d", sheet, name, from, name, to)
	}
	c := baseChart(excelize.Scatter, title, "Wavelength (nm)", "Relative intensity")
	c.Dimension = excelize.ChartDimension{Width: 640, Height: spectraHigh}
	lo, hi, zero, one := math.Inf(1), math.Inf(-1), 0.0, 1.0
	for k, x := range cs {
		l := &x.em
		if col == 1 {
			l = &x.ex
		}
		a, z := bounds(l.nm)
		lo, hi = min(lo, a), max(hi, z)
		color := series(k)
		c.Series = append(c.Series, excelize.ChartSeries{Name: ref(col+1+k, from-1, from-1), Categories: ref(col, from, to), Values: ref(col+1+k, from, to),
			Marker: excelize.ChartMarker{Symbol: "none"}, Fill: solidFill(fmt.Sprintf("%02X%02X%02X", color.R, color.G, color.B)),
			Line: excelize.LineOptions{Type: excelize.LineSolid, Width: 1.75, Dash: []excelize.LineDashType{excelize.LineDashSolid, excelize.LineDashDash, excelize.LineDashSysDot}[k%3]}})
	}
	step := niceStep(hi-lo, 12) // marks at round wavelengths
	lo, hi = math.Floor(lo/step)*step, math.Ceil(hi/step)*step
	c.XAxis.Minimum, c.XAxis.Maximum, c.YAxis.Minimum, c.YAxis.Maximum = &lo, &hi, &zero, &one
	c.XAxis.MajorUnit, c.YAxis.MajorUnit = step, 0.2
	return c
}
