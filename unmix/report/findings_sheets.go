package report

import (
	"strings"

	"tarnlight/eem"
)

// flagsSheet lists every finding in words, the gravest first.
func (r *results) flagsSheet(b *book) {
	heads := []string{"Severity", "Bottle", "Batch", "Component", "Finding", "What is looked for", "Found", "Limit"}
	widths := []float64{9, r.idWidth(), 12, 16, 60, 38, 9, 9}
	if len(r.s.Accepts) > 0 {
		heads, widths = append(heads, "Accepted because"), append(widths, 26)
	}
	s := b.add("Flags", layout{widths: widths, freeze: "C4", repeat: "$3:$3"})
	s.add(20, cell{"What the checks found", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"A reject makes a result unusable; a doubt must be seen and travels with the result; a note needs no action. Figures behind a finding stand in the workings.", look{color: midGrey}})
	var row []cell
	for _, h := range heads {
		l := headLook
		switch h {
		case "Found", "Limit":
			l = headRight
		case "What is looked for", "Accepted because":
			l = headIndent
		}
		row = append(row, cell{h, l})
	}
	s.add(20, row...)
	t := r.table["flags.csv"]
	for _, severity := range []eem.Severity{eem.Reject, eem.Doubt, eem.Remark} {
		for i := range t.Rows {
			if parseSeverity(t.Text(i, t.Col("severity"))) == severity {
				s.add(0, r.flagRow(i, severity)...)
			}
		}
	}
	s.table("Flags", 3, len(heads))
	s.done()
}

func (r *results) flagRow(i int, severity eem.Severity) []cell {
	t := r.table["flags.csv"]
	text := func(name string) string { return visible(t.Text(i, t.Col(name))) }
	figure := func(name string) cell {
		v := t.Float(i, t.Col(name))
		return cell{v, look{format: sigFormat(v, 4), hair: true}}
	}
	what, accepted := "", ""
	if d, ok := eem.FindTest(text("test")); ok {
		what = d.What
	}
	if severity == eem.Doubt {
		accepted = r.s.Accepts[text("test")]
	}
	_, l := severityLook(severity)
	if severity == eem.Remark {
		l = look{}
	}
	l.hair = true
	w := look{wrap: true, hair: true}
	row := []cell{{severity.String(), l}, {text("id"), w}, {text("batch"), w}, {text("component"), w}, {cut(eem.Brief(text("message")), 2000), w},
		{what, look{color: midGrey, wrap: true, hair: true, indent: true}}, figure("value"), figure("limit")}
	if len(r.s.Accepts) > 0 {
		row = append(row, cell{accepted, look{wrap: true, hair: true, indent: true}})
	}
	return row
}

// methodsSheet tells every step with formula, parameters and source.
func (r *results) methodsSheet(b *book) {
	s := b.add("Methods", layout{widths: []float64{4, 16, 44, 36, 60, 28}, freeze: "A4", repeat: "$3:$3"})
	s.add(20, cell{"How the results were made", look{bold: true, size: 13, color: inkBlue}})
	s.add(0, cell{"In the order of the work. Parameters are those in force for this survey.", look{color: midGrey}})
	var row []cell
	for i, h := range []string{"No.", "Step", "What was done", "Formula", "Parameters", "Published source"} {
		row = append(row, cell{h, []look{headLook, headIndent}[min(i/3, 1)]})
	}
	s.add(20, row...)
	for i, m := range r.methodSteps() {
		name := m.name
		if m.setup != "" {
			name += " (" + m.setup + ")"
		}
		what := m.sentences()
		first, ruled := look{wrap: true, line: true}, look{wrap: true, line: true, indent: true}
		s.add(0, cell{float64(i + 1), look{line: true, align: "left"}}, cell{name, look{bold: true, wrap: true, line: true}}, cell{what, first}, cell{m.words.formula, ruled},
			cell{strings.Join(m.params, "\n"), ruled}, cell{m.words.source, look{wrap: true, line: true, color: midGrey, indent: true}})
	}
	s.done()
}
