package report

import (
	"strings"

	"tarnlight/eem"
)

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
	return []cell{{severity.String(), l}, {text("id"), w}, {text("batch"), w}, {text("component"), w}, {text("message"), w},
		{what, look{color: midGrey, wrap: true, hair: true}}, figure("value"), figure("limit"), {accepted, look{wrap: true, hair: true, indent: true}}}
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
