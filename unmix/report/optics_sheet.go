package report

import (
	"slices"
	"strings"
)

// notOptics are the columns of samples.csv behind the first index that say nothing
// of the water.
var notOptics = []string{"notes", "doubts", "rejects", "leverage", "influence"}

// opticsColumns are the indices that some bottle has.
func (r *results) opticsColumns() []Column {
	t := r.table["samples.csv"]
	f, _ := FindFile("samples.csv")
	first := slices.IndexFunc(f.Columns, func(c Column) bool { return c.Name == "suva254" })
	var out []Column
	for _, c := range f.Columns[first:] {
		used := slices.ContainsFunc(r.bottles, func(x *bottle) bool { return finite(t.Float(x.row, t.Own(c.Name))) })
		if used && !slices.Contains(notOptics, c.Name) {
			out = append(out, c)
		}
	}
	return out
}

// opticsSheet lists the indices of the water itself, and below them what they are.
func (r *results) opticsSheet(b *book) {
	cols := r.opticsColumns()
	if len(cols) == 0 {
		return
	}
	t := r.table["samples.csv"]
	s := b.add("Optics", layout{widths: append([]float64{r.idWidth()}, slices.Repeat([]float64{10.5}, len(cols))...), freeze: "B5", repeat: "$3:$4"})
	s.heading(20, "Optical indices of the water", look{bold: true, size: 13, color: inkBlue})
	s.heading(0, "They stand for bulk properties and depend on one another. What each means stands below the table.", look{color: midGrey})
	unit, head := []cell{{"Unit", look{color: midGrey}}}, []cell{{"Bottle", headLook}}
	for _, c := range cols {
		unit = append(unit, cell{r.unitOf(c), look{color: midGrey, right: true}})
		head = append(head, cell{strings.ReplaceAll(c.Name, "_", " "), headRight})
	}
	s.add(rowHeight, unit...)
	s.add(28, head...)
	for _, x := range r.bottles {
		row := []cell{{visible(x.id), look{bold: true, hair: true}}}
		for _, c := range cols {
			v := t.Float(x.row, t.Own(c.Name))
			row = append(row, cell{v, look{format: sigFormat(v, 4), hair: true}})
		}
		s.add(rowHeight, row...)
	}
	s.table("Optics", 4, len(head))
	s.skip(1)
	for _, c := range cols {
		s.add(rowHeight, cell{strings.ReplaceAll(c.Name, "_", " "), look{bold: true}}, cell{}, cell{c.What, look{}})
	}
	s.done()
}

// unitOf is the unit of a column of ours.
func (r *results) unitOf(c Column) string {
	if c.Unit == "intensity" {
		return r.unit
	}
	return c.Unit
}
