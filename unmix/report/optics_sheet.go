package report

import (
	"slices"
)

// opticsSheet lists the indices of the water itself.
func (r *results) opticsSheet(b *book) {
	t := r.table["samples.csv"]
	f, _ := FindFile("samples.csv")
	var cols []Column
	at := func(name string) int {
		return slices.IndexFunc(f.Columns, func(c Column) bool { return c.Name == name })
	}
	for _, c := range slices.Concat(f.Columns[at("suva254"):at("peak_c")+1], f.Columns[at("quantum_yield"):at("region_5")+1]) {
		used := slices.ContainsFunc(r.bottles, func(x *bottle) bool { return finite(t.Float(x.row, t.Own(c.Name))) })
		if used {
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
