package report

import (
	"slices"
	"strings"
)

// pageTable is a table of the page that is only read; the class of its cells is "n"
// for a number, "long" for a sentence.
type pageTable struct {
	Heads []pageCell
	Rows  [][]pageCell
}

// pageTable is a results table for people: the columns named in ahead first,
// without those named in without and those that are empty, numbers rounded.
func (r *results) pageTable(name string, ahead []string, without ...string) pageTable {
	t := r.table[name]
	var out pageTable
	var cols []int
	for _, head := range append(slices.Clone(ahead), t.Columns...) {
		c := t.Col(head)
		used := slices.ContainsFunc(t.Rows, func(row []string) bool { return row[c] != "" })
		if used && !slices.Contains(without, head) && !slices.Contains(cols, c) {
			cols = append(cols, c)
			out.Heads = append(out.Heads, pageCell{Text: strings.ReplaceAll(head, "_", " ")})
		}
	}
	for i := range t.Rows {
		var row []pageCell
		for _, c := range cols {
			row = append(row, r.readCell(t, i, c))
		}
		out.Rows = append(out.Rows, row)
	}
	out.align()
	return out
}

// align puts heads over numbers where the numbers stand.
func (t *pageTable) align() {
	for c := range t.Heads {
		for _, row := range t.Rows {
			if row[c].Class == "n" {
				t.Heads[c].Class = "n"
			}
		}
	}
}

// readCell is cell c of row i, which is only read: an uncertainty with two digits,
// another number with five.
func (r *results) readCell(t *Table, i, c int) pageCell {
	text := t.Text(i, c)
	v := t.Float(i, c)
	switch name := t.Columns[c]; {
	case !finite(v) && len(text) > 24:
		return pageCell{Text: text, Class: "long"}
	case !finite(v):
		return pageCell{Text: yesNo(text)}
	case strings.Contains(name, "uncertainty") || strings.Contains(name, "error") || strings.HasSuffix(name, "rms"):
		return pageCell{Text: r.num.sig(v, 2), Class: "n"}
	case strings.HasSuffix(name, "percent"):
		return pageCell{Text: r.num.short(v, 4), Class: "n"}
	}
	return pageCell{Text: r.num.short(v, 5), Class: "n"}
}

// pageModels is the table of candidate models, a column a number of components, so
// that it fits on a page.
func (r *results) pageModels() pageTable {
	t := r.table["models.csv"]
	if len(t.Rows) == 0 {
		return pageTable{}
	}
	out := pageTable{Heads: []pageCell{{Text: "components"}}}
	for i := range t.Rows {
		out.Heads = append(out.Heads, pageCell{Text: t.Text(i, t.Col("components"))})
	}
	for _, name := range r.modelRows() {
		if slices.Contains([]string{"seed", "loss", "samples", "cells"}, name) {
			continue
		}
		row := []pageCell{{Text: strings.ReplaceAll(name, "_", " ")}}
		for i := range t.Rows {
			row = append(row, r.readCell(t, i, t.Col(name)))
		}
		out.Rows = append(out.Rows, row)
	}
	out.align()
	return out
}
