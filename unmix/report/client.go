package report

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
)

// reportable says whether a bottle belongs into the client's results: samples and
// field blanks do; water, standards and controls are told of elsewhere.
func (b *bottle) reportable() bool {
	return b.kind == "" || b.kind == "sample" || b.kind == "field-blank"
}

// writeClient writes report.xlsx, the workbook that is handed over. It names no
// path, user or machine.
func (r *results) writeClient() error {
	b := newBook(r.title(), r.title()+joinNonEmpty(" · ", "", r.s.Number), "Result mark "+r.mark)
	r.summarySheet(b)
	r.resultsSheet(b)
	r.flagsSheet(b)
	r.methodsSheet(b)
	return b.write(filepath.Join(r.dir, "report.xlsx"))
}

func joinNonEmpty(sep string, parts ...string) string {
	out := ""
	for i, p := range parts {
		if p == "" {
			continue
		}
		if out != "" || i > 0 {
			out += sep
		}
		out += p
	}
	return out
}

var (
	headLook   = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true}
	headRight  = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true, right: true}
	headIndent = look{bold: true, fill: paleBlue, color: inkBlue, wrap: true, middle: true, line: true, indent: true}
	partLook   = look{bold: true, size: 11, color: inkBlue, line: true}
	plainLook  = look{}
	wrapLook   = look{wrap: true}
)

const summaryColumns = 7

// summarySheet is the first page: for whom, what, how good, how to read it.
func (r *results) summarySheet(b *book) {
	s := b.add("Summary", layout{portrait: true, widths: []float64{24, 12, 12, 12, 12, 14, 26}})
	s.add(26, cell{plain(r.title()), look{bold: true, size: 16, color: inkBlue}})
	s.add(0, cell{"Excitation-emission fluorescence of water: results", look{size: 10, color: midGrey}})
	s.skip(1)
	for _, f := range [][2]string{{"Client", r.s.Client}, {"Order", r.s.Order}, {"Report number", r.s.Number}, {"Method", r.s.Method}, {"Remarks", r.s.Remarks}} {
		if f[1] != "" {
			r.wide(s, f[0], f[1])
		}
	}
	r.wide(s, "Result mark", r.mark+" – the same mark stands at the foot of every page that belongs to these results")
	s.skip(1)
	r.part(s, "What was found")
	for _, line := range r.overview() {
		r.wide(s, line[0], line[1])
	}
	s.skip(1)
	r.componentSummary(s)
	r.batchSummary(s)
	r.part(s, "How to read the results")
	r.wide(s, "± (k = 2)", "Half-width of the interval that holds the true value with about 95 % probability: expanded uncertainty, coverage factor k = 2. Value and ± are shown to the same decimal; the cells hold all digits.")
	r.wide(s, "< number", "Not detected; the number is the detection limit.")
	for _, q := range qualifiers {
		r.wide(s, "Q "+q[0], q[1])
	}
	s.skip(1)
	r.part(s, "Cautions")
	for _, c := range cautions {
		r.wide(s, "", c)
	}
	s.skip(1)
	r.part(s, "Release")
	for _, p := range [][2]string{{"Tested by", r.s.TestedBy}, {"Approved by", r.s.ApprovedBy}} {
		s.add(30, cell{p[0], look{bold: true, middle: true}}, cell{p[1], look{middle: true}}, cell{}, cell{"Date, signature", look{color: midGrey, middle: true}},
			cell{nil, look{line: true}}, cell{nil, look{line: true}}, cell{nil, look{line: true}})
	}
	s.done()
}

// part begins a part of the page.
func (r *results) part(s *sheet, name string) {
	row := []cell{{name, partLook}}
	for range summaryColumns - 1 {
		row = append(row, cell{nil, partLook})
	}
	s.add(18, row...)
}

// wide writes a label and a text that runs across the page.
func (r *results) wide(s *sheet, label, text string) {
	s.add(lineHeight(text, 112), cell{label, look{bold: true, wrap: true}}, cell{text, wrapLook})
	s.merge(2, summaryColumns)
}

// overview counts bottles by how usable they are.
func (r *results) overview() [][2]string {
	n, field, excluded := 0, 0, 0
	count := map[eem.Severity]int{}
	t := r.table["samples.csv"]
	for _, b := range r.bottles {
		switch {
		case !b.reportable():
			continue
		case t.Text(b.row, t.Col("exclude")) != "":
			excluded++
			continue
		case b.kind == "field-blank":
			field++
		}
		n++
		count[max(b.worst, eem.Remark)]++
	}
	out := [][2]string{{"Bottles", plural(n, "bottle", "bottles") + " reported"}}
	if field > 0 {
		out[0][1] += fmt.Sprintf(", %s among them", plural(field, "field blank", "field blanks"))
	}
	if excluded > 0 {
		out[0][1] += fmt.Sprintf("; %d excluded by the run sheet", excluded)
	}
	out = append(out, [2]string{"Quality", fmt.Sprintf("%d without doubt, %d with a doubt, %d not usable", count[eem.Remark], count[eem.Doubt], count[eem.Reject])})
	for _, m := range r.methods() {
		var names []string
		for _, s := range r.series {
			if s.method == m {
				names = append(names, plain(s.component))
			}
		}
		out = append(out, [2]string{"Evaluation", methodName(m) + ": " + strings.Join(names, ", ")})
	}
	if r.unit != "" {
		out = append(out, [2]string{"Intensity unit", unitWords(r.unit)})
	}
	return out
}

func unitWords(unit string) string {
	switch eem.Unit(unit) {
	case eem.Raman:
		return "RU, Raman units: intensity over the area of water's Raman line at excitation 350 nm"
	case eem.Quinine:
		return "QSU, quinine sulfate units: 1 QSU is the intensity of 1 µg/L quinine sulfate dihydrate"
	case eem.Counts:
		return "counts of the detector; not comparable between instruments"
	}
	return unit
}

// componentSummary is the table of components with their ranges.
func (r *results) componentSummary(s *sheet) {
	if len(r.series) == 0 {
		return
	}
	r.part(s, "Components")
	var row []cell
	for i, h := range []string{"Component", "Unit", "Found in", "Lowest found", "Median found", "Highest found", "Highest in bottle"} {
		row = append(row, cell{h, []look{headLook, headLook, headRight, headRight, headRight, headRight, headIndent}[i]})
	}
	s.add(16, row...)
	for i, c := range r.series {
		var found []float64
		n, top, where := 0, math.Inf(-1), ""
		for k, x := range c.rows {
			if x == nil || !r.bottles[k].reportable() || x.qualifier == "R" {
				continue
			}
			n++
			if x.detected {
				found = append(found, x.value)
				if x.value > top {
					top, where = x.value, r.bottles[k].id
				}
			}
		}
		slices.Sort(found)
		lo, mid, hi := math.NaN(), math.NaN(), math.NaN()
		if m := len(found); m > 0 {
			lo, mid, hi = found[0], (found[m/2]+found[(m-1)/2])/2, found[m-1]
		}
		f := func(v float64) cell { return cell{v, look{format: sigFormat(v, 3), line: true}} }
		s.add(0, cell{fmt.Sprintf("%d %s", i+1, plain(r.label(c))), look{line: true, wrap: true}}, cell{c.unit, look{line: true}},
			cell{fmt.Sprintf("%d of %d", len(found), n), look{line: true, right: true}}, f(lo), f(mid), f(hi), cell{cut(plain(where), 60), look{line: true, wrap: true, indent: true}})
	}
	s.skip(1)
}

// decimalFormat is the number format with d decimals.
func decimalFormat(d int) string {
	switch {
	case d <= 0:
		return "0"
	case d > 9:
		return "0.00E+00"
	}
	return "0." + strings.Repeat("0", d)
}

// sigFormat is the number format that shows v with d significant digits.
func sigFormat(v float64, d int) string {
	if v == 0 || !finite(v) {
		return "0"
	}
	return decimalFormat(d - 1 - exponent(v, d))
}

// batchSummary is the table of verdicts.
func (r *results) batchSummary(s *sheet) {
	t := r.table["batches.csv"]
	if len(t.Rows) == 0 {
		return
	}
	r.part(s, "Batches")
	var row []cell
	for i, h := range []string{"Batch", "Measured", "Bottles", "Blanks", "Unit", "Verdict", "Why"} {
		row = append(row, cell{h, []look{headLook, headLook, headRight, headRight, headIndent, headLook, headIndent}[i]})
	}
	s.add(16, row...)
	text := func(i int, name string) string { return t.Text(i, t.Col(name)) }
	for i := range t.Rows {
		verdict, l := verdictLook(text(i, "verdict"))
		why := text(i, "reason")
		s.add(0, cell{text(i, "batch"), look{wrap: true}}, cell{date(text(i, "measured")), look{format: "yyyy-mm-dd", align: "left"}},
			cell{t.Float(i, t.Col("samples")), look{}}, cell{float64(len(strings.Fields(text(i, "blanks")))), look{}},
			cell{text(i, "unit"), look{indent: true}}, cell{verdict, l}, cell{why, look{wrap: true, indent: true}})
	}
	s.skip(1)
}

// verdictLook gives a verdict its word and ground.
func verdictLook(v string) (string, look) {
	switch v {
	case "doubt":
		return "doubt", look{fill: paleAmber, bold: true}
	case "reject", "fail":
		return v, look{fill: paleRed, bold: true}
	}
	return v, look{}
}

// date is a native date where s is one, s itself otherwise.
func date(s string) any {
	if d, ok := parseDay(s); ok {
		return d
	}
	return s
}

// resultColumn is a column of the sheet Results that the run sheet brought.
type resultColumn struct {
	head, name string
	width      float64
}

// knownColumns are those run-sheet columns that the results show, where used.
func (r *results) knownColumns() []resultColumn {
	t := r.table["samples.csv"]
	var out []resultColumn
	for _, c := range []resultColumn{{"Kind", "kind", 11}, {"Site", "site", 16}, {"Sampled", "sampled", 15}, {"Measured", "measured", 15}, {"Dilution", "dilution", 8}} {
		col, used := t.Col(c.name), false
		for _, b := range r.bottles {
			v := t.Text(b.row, col)
			if b.reportable() && v != "" && !(c.name == "kind" && v == "sample") && !(c.name == "dilution" && v == "1") {
				used = true
			}
		}
		if used {
			out = append(out, c)
		}
	}
	return out
}

// resultsSheet is one row a bottle.
func (r *results) resultsSheet(b *book) {
	known := r.knownColumns()
	widths := []float64{16}
	heads := []cell{{"Bottle", headLook}}
	for _, k := range known {
		widths, heads = append(widths, k.width), append(heads, cell{k.head, headLook})
	}
	for i, c := range r.series {
		widths = append(widths, 11, 8, 4.5)
		name := fmt.Sprintf("%d %s", i+1, cut(plain(r.label(c)), 60))
		if c.unit != "" {
			name += ", " + plain(c.unit)
		}
		mid := headLook
		mid.align = "center"
		heads = append(heads, cell{name, headRight}, cell{fmt.Sprintf("± %d", i+1), headRight}, cell{fmt.Sprintf("Q %d", i+1), mid})
	}
	widths = append(widths, 10, 12, 52)
	heads = append(heads, cell{"Explained, %", headRight}, cell{"Check", headIndent}, cell{"Remarks", headLook})
	const headRow = 4
	s := b.add("Results", layout{widths: widths, freeze: fmt.Sprintf("B%d", headRow+1), repeat: fmt.Sprintf("$%d:$%d", headRow, headRow)})
	s.add(20, cell{plain(r.title()) + " – results", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"± is the expanded uncertainty (k = 2, about 95 %). < is followed by the detection limit. Q: U not detected, J unreliable or above the highest standard, R not usable. Screening: see Cautions on the sheet Summary.", look{color: midGrey}})
	s.skip(1)
	s.add(52, heads...)
	for _, x := range r.bottles {
		if x.reportable() {
			s.add(0, r.resultRow(x, known)...)
		}
	}
	s.table("Results", headRow, len(heads))
	s.done()
}

func (r *results) resultRow(x *bottle, known []resultColumn) []cell {
	t := r.table["samples.csv"]
	row := []cell{{visible(x.id), look{bold: true, wrap: true}}}
	for _, k := range known {
		row = append(row, sheetCell(k.name, t.Text(x.row, t.Col(k.name))))
	}
	for _, c := range r.series {
		row = append(row, r.valueCells(x.of[c])...)
	}
	word, l := severityLook(x.worst)
	l.indent = true
	row = append(row, cell{t.Float(x.row, t.Own("explained_percent")), look{format: "0.0"}}, cell{word, l}, cell{r.remarks(x), wrapLook})
	for i := range row {
		row[i].l.hair = true
	}
	return row
}

// sheetCell is a run-sheet cell as what it is: a date, a number or text.
func sheetCell(name, v string) cell {
	switch name {
	case "sampled", "measured":
		if d, ok := parseDay(v); ok {
			f := "yyyy-mm-dd"
			if d.Hour()+d.Minute() > 0 {
				f += " hh:mm"
			}
			return cell{d, look{format: f, align: "left"}}
		}
	case "dilution":
		if f, ok := number(v); ok {
			return cell{f, look{format: "0.###"}}
		}
	}
	return cell{v, plainLook}
}

// valueCells are value, ± and qualifier of one contribution, as native numbers: a
// contribution that was not detected shows its detection limit behind "<".
func (r *results) valueCells(c *contribution) []cell {
	grey := look{color: midGrey, right: true}
	if c == nil {
		return []cell{{}, {}, {}}
	}
	q := cell{c.qualifier, look{align: "center", bold: true}}
	switch c.qualifier {
	case "R":
		q.l.fill = paleGrey
		return []cell{{c.reported, look{color: midGrey, right: true, italic: true, fill: paleGrey}}, {nil, look{fill: paleGrey}}, q}
	case "U":
		if !finite(c.limit) {
			return []cell{{c.reported, grey}, {}, q}
		}
		grey.format = `"< "` + reportedFormat(c.reported, c.limit)
		return []cell{{c.limit, grey}, {}, q}
	case "J":
		q.l.fill = paleAmber
	}
	format := reportedFormat(c.reported, c.value)
	return []cell{{c.value, look{format: format}}, {c.expanded(), look{format: format, color: midGrey}}, q}
}

// reportedFormat is the number format that shows a number as the text of reported
// does: with its decimals, or with its exponent.
func reportedFormat(reported string, v float64) string {
	text := strings.TrimPrefix(reported, "< ")
	mantissa, exponent, hasExponent := strings.Cut(text, "e")
	if _, err := strconv.ParseFloat(text, 64); err != nil || (hasExponent && exponent == "") {
		return sigFormat(v, 3)
	}
	_, tail, _ := strings.Cut(mantissa, ".")
	format := "0"
	if tail != "" {
		format += "." + strings.Repeat("0", len(tail))
	}
	if hasExponent {
		format += "E+0"
	}
	return format
}

// severityLook gives the worst finding its word and ground.
func severityLook(s eem.Severity) (string, look) {
	switch s {
	case eem.Reject:
		return "not usable", look{fill: paleRed, bold: true}
	case eem.Doubt:
		return "doubt", look{fill: paleAmber, bold: true}
	case eem.Remark:
		return "note", look{}
	}
	return "good", look{}
}

// remarks are the reasons of a bottle's qualifiers and its doubts, in words.
func (r *results) remarks(x *bottle) string {
	var out []string
	say := func(s string) {
		if s != "" && !strings.Contains(strings.Join(out, "; "), s) {
			out = append(out, s)
		}
	}
	t := r.table["samples.csv"]
	if why := t.Text(x.row, t.Col("exclude")); why != "" {
		say("excluded: " + why)
	}
	f := r.table["flags.csv"]
	for _, i := range x.flags {
		if parseSeverity(f.Text(i, f.Col("severity"))) >= eem.Doubt {
			say(f.Text(i, f.Col("message")))
		}
	}
	for _, c := range r.series {
		if k := x.of[c]; k != nil {
			for _, reason := range strings.Split(k.reasons, "; ") {
				say(reason)
			}
		}
	}
	return strings.Join(out, "; ")
}

// flagsSheet lists every finding in words, the gravest first.
func (r *results) flagsSheet(b *book) {
	heads := []string{"Severity", "Bottle", "Batch", "Component", "Finding", "What is looked for", "Found", "Limit", "Accepted because"}
	s := b.add("Flags", layout{widths: []float64{11, 16, 14, 18, 62, 46, 10, 10, 26}, freeze: "C4", repeat: "$3:$3"})
	s.add(20, cell{"What the checks found", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"A reject makes a result unusable; a doubt must be seen and travels with the result; a note needs no action.", look{color: midGrey}})
	var row []cell
	for _, h := range heads {
		l := headLook
		if h == "Found" || h == "Limit" {
			l = headRight
		}
		if h == "Accepted because" {
			l = headIndent
		}
		row = append(row, cell{h, l})
	}
	s.add(20, row...)
	t := r.table["flags.csv"]
	text := func(i int, name string) string { return t.Text(i, t.Col(name)) }
	for _, severity := range []eem.Severity{eem.Reject, eem.Doubt, eem.Remark} {
		for i := range t.Rows {
			if parseSeverity(text(i, "severity")) != severity {
				continue
			}
			what := ""
			if d, ok := eem.FindTest(text(i, "test")); ok {
				what = d.What
			}
			_, l := severityLook(severity)
			if severity == eem.Remark {
				l = look{}
			}
			accepted := ""
			if severity == eem.Doubt {
				accepted = r.s.Accepts[text(i, "test")]
			}
			l.hair = true
			w := look{wrap: true, hair: true}
			g := func(name string) cell {
				v := t.Float(i, t.Col(name))
				return cell{v, look{format: sigFormat(v, 4), hair: true}}
			}
			s.add(0, cell{severity.String(), l}, cell{visible(text(i, "id")), w}, cell{text(i, "batch"), w}, cell{text(i, "component"), w},
				cell{text(i, "message"), w}, cell{what, look{color: midGrey, wrap: true, hair: true}}, g("value"), g("limit"), cell{accepted, look{wrap: true, hair: true, indent: true}})
		}
	}
	s.table("Flags", 3, len(heads))
	s.done()
}

// methodsSheet tells every step with formula, parameters and source.
func (r *results) methodsSheet(b *book) {
	s := b.add("Methods", layout{widths: []float64{5, 19, 52, 46, 44, 34}, freeze: "A4", repeat: "$3:$3"})
	s.add(20, cell{"How the results were made", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"In the order of the work. Parameters are those in force for this survey.", look{color: midGrey}})
	var row []cell
	for _, h := range []string{"No.", "Step", "What was done", "Formula", "Parameters", "Published source"} {
		row = append(row, cell{h, headLook})
	}
	s.add(20, row...)
	for i, m := range r.methodSteps() {
		name := m.name
		if m.setup != "" {
			name += " (" + m.setup + ")"
		}
		what := joinNonEmpty(" ", strings.TrimSpace(m.words.what))
		if len(m.done) > 0 {
			what = strings.TrimSpace(what + " Here: " + strings.Join(m.done, "; ") + ".")
		}
		ruled := look{wrap: true, line: true}
		s.add(0, cell{float64(i + 1), look{line: true, align: "left"}}, cell{name, look{bold: true, wrap: true, line: true}}, cell{what, ruled}, cell{m.words.formula, ruled},
			cell{strings.Join(m.params, "\n"), ruled}, cell{m.words.source, look{wrap: true, line: true, color: midGrey}})
	}
	s.done()
}
