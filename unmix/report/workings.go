package report

import (
	"bytes"
	"fmt"
	"image"
	"image/png"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"github.com/xuri/excelize/v2"

	"tarnlight/eem"
)

// worstMaps is how many residual maps workings.xlsx holds as coloured cells: 100
// of them make a file too slow to open.
const worstMaps = 25

// writeWorkings writes workings.xlsx, the laboratory's own workbook.
func (r *results) writeWorkings(p *pass) error {
	b := newBook(r.title()+" – workings", r.title()+joinNonEmpty(" · ", "", r.s.Number), "Workings. Result mark "+r.mark)
	r.qualitySheet(b)
	for _, m := range r.methods() {
		r.componentsSheet(b, m)
	}
	r.tableSheet(b, "Models", "models.csv", "Candidate numbers of components")
	r.tableSheet(b, "Splits", "splits.csv", "Congruence of split halves")
	if err := r.residualSheet(b, p); err != nil {
		return err
	}
	r.thumbnailSheet(b, p)
	r.opticsSheet(b)
	r.tableSheet(b, "Budget", "budget.csv", "Uncertainty by cause")
	r.tableSheet(b, "Batches", "batches.csv", "Batches")
	r.tableSheet(b, "Calibration", "calibration.csv", "Given, found and recovery of standards, controls and spikes")
	r.tableSheet(b, "Samples", "samples.csv", "Run sheet and fit, one row a bottle")
	r.tableSheet(b, "Steps", "steps.csv", "Every step with its parameters")
	r.provenanceSheet(b)
	return b.write(filepath.Join(r.dir, "workings.xlsx"))
}

// maxRows bounds a sheet below the 1,048,576 rows of the format.
const maxRows = 1_000_000

// tableSheet writes a results table as it is, numbers as numbers.
func (r *results) tableSheet(b *book, name, file, title string) {
	t := r.table[file]
	if len(t.Rows) == 0 {
		return
	}
	f, _ := FindFile(file)
	t = t.filled()
	s := b.add(name, layout{widths: columnWidths(t), freeze: "B4", repeat: "$3:$3"})
	s.add(20, cell{title, look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"The content of " + file + "; " + f.What + ".", look{color: midGrey}})
	s.add(30, uniqueHeads(t.Columns)...)
	for i := range t.Rows[:min(len(t.Rows), maxRows)] {
		row := make([]cell, len(t.Columns))
		for c := range row {
			row[c] = tableCell(visible(t.Text(i, c)))
		}
		s.add(rowHeight, row...)
	}
	s.table(strings.ReplaceAll(name, " ", "_"), 3, len(t.Columns))
	s.done()
}

// tableCell is a number where the text is exactly one, a truth value as a word,
// and text otherwise.
func tableCell(text string) cell {
	if v, ok := number(text); ok && !strings.Contains(text, ",") {
		return cell{v, look{format: shortFormat(v)}}
	}
	return cell{text, look{indent: true}}
}

// shortFormat shows at most five significant digits and no zeros behind them.
func shortFormat(v float64) string {
	d := 4 - exponent(v, 5)
	switch {
	case v == math.Trunc(v) && math.Abs(v) < 1e12 || d <= 0:
		return "0"
	case d > 9:
		return "0.0000E+00"
	}
	return "0." + strings.Repeat("#", d)
}

// filled is the table without the columns that are empty throughout.
func (t *Table) filled() *Table {
	out := &Table{Name: t.Name, Rows: make([][]string, len(t.Rows))}
	for c, name := range t.Columns {
		if !slices.ContainsFunc(t.Rows, func(row []string) bool { return row[c] != "" }) {
			continue
		}
		out.Columns = append(out.Columns, name)
		for i, row := range t.Rows {
			out.Rows[i] = append(out.Rows[i], row[c])
		}
	}
	return out
}

// uniqueHeads are column heads that a defined table takes: none empty, none twice,
// whatever the case of their letters.
func uniqueHeads(names []string) []cell {
	seen := map[string]bool{}
	var out []cell
	for _, n := range names {
		n = strings.ReplaceAll(cut(plain(n), 120), "_", " ")
		for n == "" || seen[strings.ToLower(n)] {
			n += "'"
		}
		seen[strings.ToLower(n)] = true
		out = append(out, cell{n, headIndent})
	}
	return out
}

// columnWidths suits the first rows of a table.
func columnWidths(t *Table) []float64 {
	w := make([]float64, len(t.Columns))
	for c, name := range t.Columns {
		longest := longestWord(name) + 2
		for i := range t.Rows[:min(len(t.Rows), 200)] {
			text := t.Text(i, c)
			if _, ok := number(text); ok {
				text = text[:min(len(text), 9)]
			}
			longest = max(longest, len([]rune(text)))
		}
		w[c] = float64(min(max(longest+2, 9), 60))
	}
	return w
}

func longestWord(name string) int {
	n := 0
	for _, w := range strings.FieldsFunc(name, func(r rune) bool { return r == '_' || r == ' ' }) {
		n = max(n, len([]rune(w)))
	}
	return n
}

// qualitySheet has the quality charts as native charts with their numbers.
func (r *results) qualitySheet(b *book) {
	t := r.table["charts.csv"]
	if len(t.Rows) == 0 {
		return
	}
	var names []string
	rows := map[string][]int{}
	for i := range t.Rows {
		v := t.Text(i, t.Col("variable"))
		if rows[v] == nil {
			names = append(names, v)
		}
		rows[v] = append(rows[v], i)
	}
	const first, chartRows = 4, 17 // a chart is 300 pixels high, a row 20
	data := first + chartRows*len(names)
	heads := []string{"variable", "batch", "id", "measured", "value", "unit", "centre", "warn_low", "warn_high", "act_low", "act_high", "verdict", "rule"}
	s := b.add("Quality", layout{widths: []float64{24, 14, 12, 16, 12, 10, 12, 12, 12, 12, 12, 10, 24}}, func(f *excelize.File, sheet string) error {
		at := data + 1
		for k, name := range names {
			n := len(rows[name])
			if err := f.AddChart(sheet, fmt.Sprintf("A%d", first+chartRows*k), qualityChart(sheet, plain(name), t.Text(rows[name][0], t.Col("unit")), data, at, at+n-1)); err != nil {
				return err
			}
			at += n
		}
		return nil
	})
	s.add(20, cell{"Quality charts", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Dots: found. Lines: expected value, warning limits, action limits. The numbers stand below.", look{color: midGrey}})
	s.skip(data - s.row)
	s.add(20, uniqueHeads(heads)...)
	for _, name := range names {
		for _, i := range rows[name] {
			var row []cell
			for _, h := range heads {
				c := tableCell(t.Text(i, t.Col(h)))
				if h == "measured" {
					c = sheetCell("measured", t.Text(i, t.Col(h)))
				}
				row = append(row, c)
			}
			s.add(rowHeight, row...)
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
	c.Dimension = excelize.ChartDimension{Width: 900, Height: 300}
	c.Series = []excelize.ChartSeries{
		{Name: name("E"), Categories: ref("B"), Values: ref("E"), Line: excelize.LineOptions{Type: excelize.LineNone},
			Marker: excelize.ChartMarker{Symbol: "circle", Size: 6, Fill: solidFill("1F4FA8")}},
		line("G", "303030", excelize.LineDashSolid),
		line("H", "C07000", excelize.LineDashDash), line("I", "C07000", excelize.LineDashDash),
		line("J", "901818", excelize.LineDashSysDot), line("K", "901818", excelize.LineDashSysDot),
	}
	return c
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
		Legend: excelize.ChartLegend{Position: "bottom"}, Format: excelize.GraphicOptions{AltText: title, Positioning: "oneCell"}}
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
	const first, rows = 4, 21
	data := first + rows
	n := len(cs)
	s := b.add(name, layout{widths: append([]float64{14}, slices.Repeat([]float64{13}, 2*n+2)...)}, func(f *excelize.File, sheet string) error {
		ex := spectraChart(sheet, "Excitation spectra", cs, 1, data+1, data+len(cs[0].ex.nm))
		em := spectraChart(sheet, "Emission spectra", cs, n+3, data+1, data+len(cs[0].em.nm))
		if err := f.AddChart(sheet, fmt.Sprintf("A%d", first), ex); err != nil {
			return err
		}
		right, _ := excelize.CoordinatesToCellName(max(n+3, 8), first)
		return f.AddChart(sheet, right, em)
	})
	s.add(20, cell{"Components – " + methodName(method), look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Relative intensity, maximum 1; an empty cell and a gap in the line where the data leave a loading open.", look{color: midGrey}})
	s.skip(data - s.row)
	row := []cell{{"Excitation (nm)", headLook}}
	for _, c := range cs {
		row = append(row, cell{plain(c.name), headRight})
	}
	row = append(row, cell{}, cell{"Emission (nm)", headLook})
	for _, c := range cs {
		row = append(row, cell{plain(c.name), headRight})
	}
	s.add(28, row...)
	for i := range max(len(cs[0].ex.nm), len(cs[0].em.nm)) {
		row := make([]cell, 2*n+3)
		put := func(at int, l func(c *component) *line) {
			if x := l(cs[0]); i < len(x.nm) {
				row[at] = cell{x.nm[i], look{format: "0.##"}}
			}
			for k, c := range cs {
				if x := l(c); i < len(x.v) {
					row[at+1+k] = cell{x.v[i], look{format: "0.0000"}}
				}
			}
		}
		put(0, func(c *component) *line { return &c.ex })
		put(n+2, func(c *component) *line { return &c.em })
		s.add(rowHeight, row...)
	}
	s.done()
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
	c.Dimension = excelize.ChartDimension{Width: 640, Height: 390}
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
	lo, hi = math.Floor(lo/10)*10, math.Ceil(hi/10)*10
	c.XAxis.Minimum, c.XAxis.Maximum, c.YAxis.Minimum, c.YAxis.Maximum = &lo, &hi, &zero, &one
	return c
}

// worst lists the bottles with a map by how far their residual rms stands above
// the noise (or by the rms alone where noise is unknown), worst first.
func (r *results) worst() []*bottle {
	t := r.table["samples.csv"]
	rank := func(b *bottle) float64 {
		v := t.Float(b.row, t.Own("residual_rms"))
		if n := t.Float(b.row, t.Own("noise_rms")); n > 0 {
			v /= n
		}
		return zero(v)
	}
	var out []*bottle
	for _, b := range r.bottles {
		if b.at >= 0 && b.reportable() && b.worst < eem.Reject {
			out = append(out, b)
		}
	}
	slices.SortStableFunc(out, func(a, b *bottle) int {
		switch x, y := rank(a), rank(b); {
		case x > y:
			return -1
		case x < y:
			return 1
		}
		return 0
	})
	return out
}

// residualSheet shows the hottest spots as a table and the worst residual maps as
// coloured cells: emission across, excitation up.
func (r *results) residualSheet(b *book, p *pass) error {
	if r.store == nil || len(r.store.Methods) == 0 {
		return nil
	}
	method, g := r.store.Methods[0], r.store.Grid
	worst := r.worst()
	shown := worst[:min(len(worst), worstMaps)]
	skip := 1 + (g.Em.Len()-1)/200 // at most 200 columns
	cols := (g.Em.Len() + skip - 1) / skip
	const first = 4
	block := g.Ex.Len() + 3
	maps := make([][]float64, len(shown))
	tops := make([]float64, len(shown))
	for i, x := range shown {
		s, err := r.store.Sample(x.at)
		if err != nil {
			return err
		}
		q := newPanels(s, method)
		maps[i], tops[i] = q.residual, q.residualScale
	}
	s := b.add("Residual maps", layout{widths: append([]float64{10}, slices.Repeat([]float64{0.9}, cols)...), zoom: 70}, func(f *excelize.File, sheet string) error {
		for i := range shown {
			top := first + i*block + 1
			from, _ := excelize.CoordinatesToCellName(2, top)
			to, _ := excelize.CoordinatesToCellName(1+cols, top+g.Ex.Len()-1)
			err := f.SetConditionalFormat(sheet, from+":"+to, []excelize.ConditionalFormatOptions{{Type: "3_color_scale", Criteria: "=",
				MinType: "num", MidType: "num", MaxType: "num", MinValue: Number(-tops[i]), MidValue: "0", MaxValue: Number(tops[i]),
				MinColor: hexOf(0), MidColor: hexOf(divLen / 2), MaxColor: hexOf(divLen - 1)}})
			if err != nil {
				return err
			}
		}
		return nil
	})
	s.add(20, cell{"Residual maps: measured − model (" + methodName(method) + ")", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{fmt.Sprintf("The %d worst by residual rms over noise. Emission across, excitation up; blue below zero, brown above; grey where missing.", len(shown)), look{color: midGrey}})
	s.skip(1)
	number, gap := look{format: ";;;", size: 6}, look{fill: "D6D6D6", size: 6}
	for i, x := range shown {
		s.skip(first + i*block - s.row)
		s.add(rowHeight, cell{cut(visible(x.id), 100) + "   colours end at ±" + r.num.sig(tops[i], 2) + " " + r.unit, look{bold: true}})
		for j := g.Ex.Len() - 1; j >= 0; j-- {
			row := []cell{{g.Ex.At(j), look{size: 6, color: midGrey, format: "0.##"}}}
			for k := 0; k < g.Em.Len(); k += skip {
				v := math.NaN()
				if maps[i] != nil {
					v = maps[i][g.Index(j, k)]
				}
				if !finite(v) {
					row = append(row, cell{nil, gap})
					continue
				}
				row = append(row, cell{v, number})
			}
			s.add(6, row...)
		}
		s.add(10, cell{nil, look{}}, cell{fmt.Sprintf("emission %s to %s nm", r.num.nm(g.Em.First()), r.num.nm(g.Em.Last())), look{size: 7, color: midGrey}})
	}
	s.done()
	r.hotSheet(b, worst)
	return nil
}

func hexOf(level int) string {
	c := diverging(divLen)[level]
	return fmt.Sprintf("#%02X%02X%02X", c.R, c.G, c.B)
}

// hotSheet lists the hottest spot of every bottle, worst bottle first.
func (r *results) hotSheet(b *book, worst []*bottle) {
	t := r.table["samples.csv"]
	s := b.add("Hottest spots", layout{portrait: true, widths: []float64{22, 12, 12, 14, 14, 14, 12, 12}, freeze: "B4", repeat: "$3:$3"})
	s.add(20, cell{"Largest residual of every bottle", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"In " + r.unit + "; the bottle with the largest residual rms over noise first.", look{color: midGrey}})
	var heads []cell
	for i, h := range []string{"Bottle", "Excitation, nm", "Emission, nm", "Largest residual", "Residual rms", "Noise rms", "Explained, %", "Structure z"} {
		heads = append(heads, cell{h, []look{headLook, headRight}[min(i, 1)]})
	}
	s.add(28, heads...)
	for _, x := range worst {
		row := []cell{{visible(x.id), look{bold: true}}}
		for _, name := range []string{"hottest_ex_nm", "hottest_em_nm", "hottest_value", "residual_rms", "noise_rms", "explained_percent", "structure"} {
			v := t.Float(x.row, t.Own(name))
			row = append(row, cell{v, look{format: sigFormat(v, 4)}})
		}
		s.add(rowHeight, row...)
	}
	s.table("Hottest_spots", 3, len(heads))
	s.done()
}

// thumb is a small picture of a bottle: measured beside residual.
func thumb(g eem.Grid, p panels) []byte {
	const w, h = 110, 90
	c := newCanvas(2*w+6, h)
	newMapping(image.Rect(0, 0, w, h), g).drawTo(c, p.measured, scale{p.scale, false})
	if p.residual != nil {
		newMapping(image.Rect(w+6, 0, 2*w+6, h), g).drawTo(c, p.residual, scale{p.residualScale, true})
	}
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestSpeed}
	if err := e.Encode(&b, c.Paletted); err != nil {
		panic("report: " + err.Error()) // a bytes.Buffer takes everything
	}
	return b.Bytes()
}

// thumbnailSheet shows every bottle small.
func (r *results) thumbnailSheet(b *book, p *pass) {
	const cols, rowsEach = 4, 6
	var with []int
	for i, t := range p.thumbs {
		if t != nil {
			with = append(with, i)
		}
	}
	if len(with) == 0 {
		return
	}
	s := b.add("Thumbnails", layout{portrait: true, widths: slices.Repeat([]float64{34}, cols)}, func(f *excelize.File, sheet string) error {
		for n, i := range with {
			at, _ := excelize.CoordinatesToCellName(1+n%cols, 5+n/cols*rowsEach)
			err := f.AddPictureFromBytes(sheet, at, &excelize.Picture{Extension: ".png", File: p.thumbs[i],
				Format: &excelize.GraphicOptions{AltText: "measured and residual map of " + cut(plain(r.bottles[i].id), 60), OffsetX: 2, OffsetY: 1, Positioning: "oneCell"}})
			if err != nil {
				return err
			}
		}
		return nil
	})
	s.add(20, cell{"Every bottle: measured, and what the model leaves", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"Each on its own scale; the pictures in maps/ state the scales.", look{color: midGrey}})
	for n := 0; n < len(with); n += cols {
		s.skip(4 + n/cols*rowsEach - s.row)
		var row []cell
		for _, i := range with[n:min(n+cols, len(with))] {
			word, l := severityLook(r.bottles[i].worst)
			l.bold, l.fill = true, ""
			row = append(row, cell{cut(plain(r.bottles[i].id), 24) + " – " + word, l})
		}
		s.add(rowHeight, row...)
	}
	s.done()
}

// opticsSheet lists the indices of the water itself.
func (r *results) opticsSheet(b *book) {
	t := r.table["samples.csv"]
	f, _ := FindFile("samples.csv")
	var cols []Column
	for _, c := range f.Columns[slices.IndexFunc(f.Columns, func(c Column) bool { return c.Name == "suva254" }):] {
		used := slices.ContainsFunc(r.bottles, func(x *bottle) bool { return finite(t.Float(x.row, t.Own(c.Name))) })
		if used && !slices.Contains([]string{"notes", "doubts", "rejects"}, c.Name) {
			cols = append(cols, c)
		}
	}
	if len(cols) == 0 {
		return
	}
	s := b.add("Optics", layout{widths: append([]float64{18}, slices.Repeat([]float64{12}, len(cols))...), freeze: "B6", repeat: "$3:$5"})
	s.add(20, cell{"Optical indices of the water", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"They stand for bulk properties and depend on one another; see the sources before reading more into them.", look{color: midGrey}})
	what, unit, head := []cell{{nil, wrapLook}}, []cell{{"unit", look{color: midGrey}}}, []cell{{"Bottle", headLook}}
	for _, c := range cols {
		u := c.Unit
		if u == "intensity" {
			u = r.unit
		}
		what = append(what, cell{c.What, look{size: 7, color: midGrey, wrap: true}})
		unit = append(unit, cell{u, look{color: midGrey, right: true}})
		head = append(head, cell{c.Name, headRight})
	}
	s.add(78, what...)
	s.add(rowHeight, unit...)
	s.add(20, head...)
	for _, x := range r.bottles {
		row := []cell{{visible(x.id), look{bold: true}}}
		for _, c := range cols {
			v := t.Float(x.row, t.Own(c.Name))
			row = append(row, cell{v, look{format: sigFormat(v, 4)}})
		}
		s.add(rowHeight, row...)
	}
	s.table("Optics", 5, len(head))
	s.done()
}
