package report

import (
	"fmt"
	"strings"

	"tarnlight/eem"
)

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

// idWidth is the width, in letters, of a column that shows most ids whole.
func (r *results) idWidth() float64 {
	wide := 0
	for _, b := range r.bottles {
		wide = max(wide, boldLetters().width(cut(visible(b.id), 40)))
	}
	return min(max(float64(wide)/8+1.5, 10), 28)
}

// resultsSheet is one row a bottle.
func (r *results) resultsSheet(b *book) {
	known := r.knownColumns()
	widths := []float64{r.idWidth()}
	heads, keep := []cell{{"Bottle", headLook}}, []int(nil)
	for _, k := range known {
		l := headLook
		if k.name == "dilution" {
			l = headRight
		}
		widths, heads = append(widths, k.width), append(heads, cell{k.head, l})
	}
	for i, c := range r.series {
		keep = append(keep, len(widths)+2, len(widths)+3)
		widths = append(widths, 11, 8.5, 5)
		name := fmt.Sprintf("%d %s", i+1, cut(plain(r.label(c)), 60))
		if c.unit != "" {
			name += ", " + plain(c.unit)
		}
		mid := headLook
		mid.align = "center"
		heads = append(heads, cell{name, headRight}, cell{fmt.Sprintf("± %d", i+1), headRight}, cell{fmt.Sprintf("Q %d", i+1), mid})
	}
	widths = append(widths, 10, 11, 60)
	heads = append(heads, cell{"Explained, %", headRight}, cell{"Check", headIndent}, cell{"Remarks", headLook})
	const headRow = 4
	s := b.add("Results", layout{widths: widths, freeze: fmt.Sprintf("B%d", headRow+1), repeat: fmt.Sprintf("$%d:$%d", headRow, headRow), keep: keep})
	s.heading(20, plain(r.title())+" – results", look{bold: true, size: 13, color: inkBlue})
	s.heading(0, "± is the expanded uncertainty (about 95 %; k = 2, more with few degrees of freedom). < is followed by the detection limit. Q: U not detected, J unreliable or above the highest standard, R not usable. Screening: see Cautions on the sheet Summary.", look{color: midGrey})
	s.skip(1)
	s.add(max(30, s.height(heads)), heads...)
	for _, x := range r.bottles {
		if x.reportable() {
			s.add(0, r.resultRow(b, x, known)...)
		}
	}
	s.table("Results", headRow, len(heads))
	s.done()
}

func (r *results) resultRow(b *book, x *bottle, known []resultColumn) []cell {
	t := r.table["samples.csv"]
	row := []cell{{visible(x.id), look{bold: true, wrap: true}}}
	for _, k := range known {
		row = append(row, sheetCell(k.name, t.Text(x.row, t.Col(k.name))))
	}
	for _, c := range r.series {
		row = append(row, r.valueCells(b, x.of[c])...)
	}
	word, l := severityLook(x.worst)
	l.indent = true
	row = append(row, cell{t.Float(x.row, t.Own("explained_percent")), look{format: "0.0"}}, cell{word, l}, cell{cut(r.remarks(x, "Summary"), 1500), wrapLook})
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
func (r *results) valueCells(b *book, c *contribution) []cell {
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
		grey.format = b.statedFormat("< ", strings.TrimPrefix(c.reported, "< "), c.limit)
		return []cell{{c.limit, grey}, {}, q}
	case "J":
		q.l.fill = paleAmber
	}
	return []cell{{c.value, look{format: b.statedFormat("", c.reported, c.value)}}, {c.expanded(), look{format: b.statedFormat("", c.stated, c.expanded()), color: midGrey}}, q}
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
