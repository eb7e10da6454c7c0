package report

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strings"

	"tarnlight/eem"
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
	r.wide(s, "± (k ≥ 2)", "Half-width of the interval that holds the true value with about 95 % probability: expanded uncertainty, coverage factor k = 2, more where the standard uncertainty rests on few degrees of freedom. Value and ± are shown to the same decimal; the cells hold all digits.")
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
	px := 0
	for _, w := range s.wide[1:summaryColumns] {
		px += columnPixels(w)
	}
	s.add(lineHeight(text, px, cellLetters()), cell{label, look{bold: true, wrap: true}}, cell{text, wrapLook})
	s.merge(2, summaryColumns)
}

// overview counts bottles by how usable they are.
func (r *results) overview() [][2]string {
	n, field, excluded := 0, 0, 0
	count := map[eem.Severity]int{}
	for _, b := range r.bottles {
		switch {
		case !b.reportable():
			continue
		case b.excluded != "":
			excluded++
			continue
		case b.kind == "field-blank":
			field++
		}
		n++
		count[max(b.worst, eem.Remark)]++
	}
	out := [][2]string{{"Bottles", eem.Count(n, "bottle") + " reported"}}
	if field > 0 {
		out[0][1] += fmt.Sprintf(", %s among them", eem.Count(field, "field blank"))
	}
	if excluded > 0 {
		out[0][1] += fmt.Sprintf("; %d excluded, which take part in nothing", excluded)
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
	out = append(out, r.onAll()...)
	if r.unit != "" {
		out = append(out, [2]string{"Intensity unit", unitWords(r.unit)})
	}
	return out
}

// onAll tells the doubts that concern every bottle, and why the model that the
// results rest on was chosen.
func (r *results) onAll() [][2]string {
	var out [][2]string
	for _, d := range r.shared {
		out = append(out, [2]string{"Doubt on " + d.on, eem.Brief(d.message)})
	}
	m := r.table["models.csv"]
	for i := range m.Rows {
		if why := m.Text(i, m.Col("reason")); m.Bool(i, m.Col("chosen")) && why != "" {
			out = append(out, [2]string{"Model", fmt.Sprintf("%s: %s", eem.Count(int(m.Float(i, m.Col("components"))), "component"), why)})
		}
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

// componentSummary is the table of components with their ranges in the samples that
// can be used.
func (r *results) componentSummary(s *sheet) {
	if len(r.series) == 0 {
		return
	}
	r.part(s, "Components")
	var row []cell
	for i, h := range []string{"Component", "Unit", "Found in, of samples", "Lowest found", "Median found", "Highest found", "Highest in bottle"} {
		row = append(row, cell{h, []look{headLook, headLook, headRight, headRight, headRight, headRight, headIndent}[i]})
	}
	s.add(0, row...)
	for i, c := range r.series {
		var found []float64
		n, top, where := 0, math.Inf(-1), ""
		for k, x := range c.rows {
			if x == nil || !r.bottles[k].sample() || x.qualifier == "R" {
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
	s.add(0, cell{"Counted and ranged are samples with a usable result; field blanks, standards and controls are not.", look{color: midGrey}})
	s.skip(1)
}

// batchSummary is the table of verdicts.
func (r *results) batchSummary(s *sheet) {
	t := r.table["batches.csv"]
	if len(t.Rows) == 0 {
		return
	}
	r.part(s, "Batches")
	var row []cell
	for i, h := range []string{"Batch", "Measured", "Samples", "Blanks", "Unit", "Verdict", "Why"} {
		row = append(row, cell{h, []look{headLook, headLook, headRight, headRight, headIndent, headLook, headIndent}[i]})
	}
	s.add(16, row...)
	text := func(i int, name string) string { return t.Text(i, t.Col(name)) }
	for i := range t.Rows {
		verdict, l := verdictLook(text(i, "verdict"))
		why := withoutRemedy(text(i, "reason"))
		s.add(0, cell{text(i, "batch"), look{wrap: true}}, cell{date(text(i, "measured")), look{format: "yyyy-mm-dd", align: "left"}},
			cell{t.Float(i, t.Col("samples")), look{}}, cell{float64(len(strings.Fields(text(i, "blanks")))), look{}},
			cell{text(i, "unit"), look{indent: true}}, cell{verdict, l}, cell{why, look{wrap: true, indent: true}})
	}
	s.skip(1)
}

var andMore = regexp.MustCompile(`\(and \d+ more\)$`)

// withoutRemedy is the reason of a verdict as a client reads it, see told.
func withoutRemedy(reason string) string {
	what, rest, _ := strings.Cut(reason, "; ")
	return strings.TrimSpace(what + " " + andMore.FindString(rest))
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
