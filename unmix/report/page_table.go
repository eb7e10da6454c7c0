package report

import (
	"maps"
	"math"
	"slices"
	"strings"
)

type pageColumn struct {
	Head, Title string
	Number      bool
	Class       string
}

// pageCell is a cell of the table of bottles: what is shown and, for numbers, what
// is sorted and filtered by.
type pageCell struct {
	Text, Sort string
	Class      string
}

type pageRow struct {
	Index                    int
	ID, Kind, Tests, Verdict string
	Class                    string
	Other, Late              bool // Late: shown by the script, when the page stands
	Cells                    []pageCell
}

// pageRows makes the table of bottles.
func (r *results) pageRows(v *page) {
	known := r.knownColumns()
	v.Columns = []pageColumn{{Head: "Bottle"}, {Head: "Check", Title: "the gravest finding: good, note, doubt or not usable"}}
	for _, k := range known {
		v.Columns = append(v.Columns, pageColumn{Head: k.head, Number: k.name == "dilution", Class: "k"})
	}
	for _, c := range r.series {
		v.Columns = append(v.Columns, pageColumn{Head: strings.TrimSpace(r.label(c) + " " + c.unit), Title: methodName(c.method), Number: true, Class: "n"})
	}
	v.Columns = append(v.Columns, pageColumn{"Explained %", "share of the bottle's sum of squares that the components explain", true, "n"},
		pageColumn{"Structure z", "how alike neighbouring residuals are: Moran's I in standard deviations", true, "n look"},
		pageColumn{"Hottest " + r.unit, "largest residual", true, "n look"}, pageColumn{"at ex/em nm", "where the largest residual lies", false, "look"})
	tests := map[string]bool{}
	for i, b := range r.bottles {
		row := r.pageRow(b, known)
		row.Index, row.Tests, row.Late = i, r.bottleTests(b, tests), i >= 250
		if !slices.Contains(v.Kinds, row.Kind) {
			v.Kinds = append(v.Kinds, row.Kind)
		}
		v.Others = v.Others || row.Other
		v.Rows = append(v.Rows, row)
	}
	v.Tests = slices.Sorted(maps.Keys(tests))
	if r.store != nil {
		for _, m := range r.store.Methods {
			v.Methods = append(v.Methods, pageChoice{m, methodName(m)})
		}
	}
}

func (r *results) pageRow(b *bottle, known []resultColumn) pageRow {
	t := r.table["samples.csv"]
	f := func(name string) float64 { return t.Float(b.row, t.Own(name)) }
	word, _ := severityLook(b.worst)
	row := pageRow{ID: visible(b.id), Kind: b.kind, Verdict: word, Class: strings.ReplaceAll(word, " ", "-"), Other: !b.reportable()}
	if b.kind == "" {
		row.Kind = "sample"
	}
	for _, k := range known {
		c := pageCell{Text: t.Text(b.row, t.Col(k.name)), Class: "k"}
		if _, ok := parseDay(c.Text); ok {
			c.Text = strings.Replace(c.Text, "T", " ", 1)
		}
		if n, ok := number(c.Text); ok && k.name == "dilution" {
			c.Sort = Number(n)
		}
		row.Cells = append(row.Cells, c)
	}
	for _, c := range r.series {
		row.Cells = append(row.Cells, r.valueCell(b.of[c]))
	}
	hot := pageCell{Class: "look"}
	if ex, em := f("hottest_ex_nm"), f("hottest_em_nm"); finite(ex) && finite(em) {
		hot.Text = r.num.nm(ex) + "/" + r.num.nm(em)
	}
	explained := r.numberCell(f("explained_percent"), 4)
	if explained.Text != "" {
		explained.Text = r.num.fixed(f("explained_percent"), 2)
	}
	row.Cells = append(row.Cells, explained, r.lookCell(f("structure")), r.lookCell(f("hottest_value")), hot)
	return row
}

// bottleTests lists the codes of a bottle's findings, between blanks.
func (r *results) bottleTests(b *bottle, all map[string]bool) string {
	f := r.table["flags.csv"]
	out := " "
	for _, k := range b.flags {
		code := f.Text(k, f.Col("test"))
		all[code] = true
		out += code + " "
	}
	return out
}

// valueCell shows a contribution as reported, which says by itself what was not
// detected or cannot be used; it is sorted by its value.
func (r *results) valueCell(c *contribution) pageCell {
	if c == nil {
		return pageCell{}
	}
	out := pageCell{Text: r.num.stated(c.reported), Class: "q" + c.qualifier}
	if c.qualifier == "J" {
		out.Text += " J"
	}
	if c.qualifier != "R" {
		out.Sort = Number(c.value)
	}
	return out
}

// lookCell is a number for who looks round; print leaves it out.
func (r *results) lookCell(v float64) pageCell {
	c := r.numberCell(v, 3)
	c.Class = "look"
	return c
}

func (r *results) numberCell(v float64, digits int) pageCell {
	if math.IsNaN(v) {
		return pageCell{}
	}
	return pageCell{Text: r.num.sig(v, digits), Sort: Number(v)}
}
