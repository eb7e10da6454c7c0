package report

import (
	"path/filepath"
	"slices"
	"strings"
)

// writeWorkings writes workings.xlsx, the laboratory's own workbook.
func (r *results) writeWorkings(p *pass) error {
	b := newBook(r.title()+" – workings", r.title()+joinNonEmpty(" · ", "", r.s.Number), "Workings. Result mark "+r.mark)
	r.qualitySheet(b)
	for _, m := range r.methods() {
		r.componentsSheet(b, m)
	}
	r.modelsSheet(b)
	r.tableSheet(b, "Splits", "splits.csv", "Congruence of split halves")
	if err := r.residualSheet(b); err != nil {
		return err
	}
	r.thumbnailSheet(b, p)
	r.opticsSheet(b)
	r.budgetSheet(b)
	r.tableSheet(b, "Limits", "limits.csv", "Limits of detection: those in force, and the published forms beside them")
	r.tableSheet(b, "Tests", "tests.csv", "Tests over many bottles, and what chance alone would give")
	r.tableSheet(b, "Batches", "batches.csv", "Batches")
	r.tableSheet(b, "Calibration", "calibration.csv", "Given, found and recovery of standards, controls and spikes")
	r.tableSheet(b, "Samples", "samples.csv", "Run sheet and fit, one row a bottle")
	r.tableSheet(b, "Findings", "flags.csv", "Every finding with the figures behind it")
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
	s.heading(20, title, look{bold: true, size: 13, color: inkBlue})
	s.heading(0, "The content of "+file+"; "+f.What+".", look{color: midGrey})
	heads := uniqueHeads(t.Columns)
	for c := range heads {
		if t.numeric(c) {
			heads[c].l = headRight
		}
	}
	s.add(0, heads...)
	for i := range t.Rows[:min(len(t.Rows), maxRows)] {
		row := make([]cell, len(t.Columns))
		for c := range row {
			row[c] = tableCell(visible(t.Text(i, c)))
		}
		s.add(0, row...)
	}
	s.table(strings.ReplaceAll(name, " ", "_"), 3, len(t.Columns))
	s.done()
}

// numeric says whether a column holds numbers and nothing else.
func (t *Table) numeric(c int) bool {
	any := false
	for i := range t.Rows {
		if text := t.Text(i, c); text != "" {
			if _, ok := number(text); !ok || strings.Contains(text, ",") {
				return false
			}
			any = true
		}
	}
	return any
}

// tableCell is a number where the text is exactly one, a truth value as a word,
// and text otherwise.
func tableCell(text string) cell {
	if v, ok := number(text); ok && !strings.Contains(text, ",") {
		return cell{v, look{format: shortFormat(v)}}
	}
	return cell{cut(yesNo(text), 2000), look{indent: true, wrap: true}}
}

// yesNo writes a truth value as a word.
func yesNo(text string) string {
	switch text {
	case "true":
		return "yes"
	case "false":
		return "no"
	}
	return text
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

// columnWidths suits the first rows of a table; longer texts are wrapped.
func columnWidths(t *Table) []float64 {
	w := make([]float64, len(t.Columns))
	for c, name := range t.Columns {
		longest := longestWord(name) + 2
		for i := range t.Rows[:min(len(t.Rows), 200)] {
			text := t.Text(i, c)
			n := len([]rune(text))
			if v, ok := number(text); ok {
				n = shortLength(v)
			}
			longest = max(longest, n)
		}
		most := 30.0
		if longest > 100 { // sentences
			most = 75
		}
		w[c] = min(max(0.85*float64(longest)+2, 8), most)
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
