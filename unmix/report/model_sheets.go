package report

import (
	"cmp"
	"slices"
	"strings"
)

// modelsSheet sets the candidate numbers of components side by side: a column a
// number, a row a figure of merit.
func (r *results) modelsSheet(b *book) {
	t := r.table["models.csv"]
	if len(t.Rows) == 0 {
		return
	}
	s := b.add("Models", layout{widths: append(append([]float64{22}, slices.Repeat([]float64{22}, len(t.Rows))...), 56), freeze: "B4", repeat: "$3:$3"})
	s.heading(20, "Candidate numbers of components", look{bold: true, size: 13, color: inkBlue})
	s.heading(0, "The content of models.csv, a column a number of components. The number that the results rest on is marked.", look{color: midGrey})
	head := []cell{{"Components", headLook}}
	for i := range t.Rows {
		head = append(head, cell{t.Float(i, t.Col("components")), headRight})
	}
	s.add(20, append(head, cell{"What it says", headIndent})...)
	for _, name := range r.modelRows() {
		s.add(0, r.modelRow(name)...)
	}
	s.done()
}

// modelRows are the columns of models.csv in the order in which a reader wants
// them; those that are empty throughout are left out.
func (r *results) modelRows() []string {
	t := r.table["models.csv"]
	out := []string{"chosen", "verdict", "reason", "explained_percent", "core_consistency", "split_half_excitation", "split_half_emission", "starts", "starts_agreeing"}
	for _, name := range t.Columns {
		if !slices.Contains(out, name) && name != "components" {
			out = append(out, name)
		}
	}
	return slices.DeleteFunc(out, func(name string) bool {
		c := t.Col(name)
		return c < 0 || !slices.ContainsFunc(t.Rows, func(row []string) bool { return row[c] != "" })
	})
}

func (r *results) modelRow(name string) []cell {
	t := r.table["models.csv"]
	f, _ := FindFile("models.csv")
	label, what := strings.ReplaceAll(name, "_", " "), ""
	if i := slices.IndexFunc(f.Columns, func(c Column) bool { return c.Name == name }); i >= 0 {
		what = f.Columns[i].What
		if u := f.Columns[i].Unit; u != "" && u != "%" {
			what += ", in " + u
		}
	}
	row := []cell{{label, look{bold: true, wrap: true, hair: true}}}
	for i := range t.Rows {
		c := tableCell(t.Text(i, t.Col(name)))
		c.l.hair = true
		if text, ok := c.v.(string); !ok || len(text) < 12 {
			c.l.right, c.l.indent = true, false
		}
		if t.Bool(i, t.Col("chosen")) {
			c.l.fill = paleBlue
		}
		row = append(row, c)
	}
	return append(row, cell{what, look{color: midGrey, wrap: true, indent: true, hair: true}})
}

// budgetKey is one value of contributions.csv.
type budgetKey struct{ id, component, method string }

// budgetSheet shows the uncertainty of every value as the shares of its causes,
// one row a value.
func (r *results) budgetSheet(b *book) {
	t := r.table["budget.csv"]
	if len(t.Rows) == 0 {
		return
	}
	causes, open := r.budgetCauses()
	rows, order := r.budgetShares(causes)
	widths := append([]float64{r.idWidth(), 18, 16, 10, 10, 9}, slices.Repeat([]float64{12}, len(causes))...)
	s := b.add("Budget", layout{widths: widths, freeze: "C4", repeat: "$3:$3"})
	s.heading(20, "Uncertainty by cause", look{bold: true, size: 13, color: inkBlue})
	note := "Shares of the variance in %; they add up to 100. Sizes, scopes and sources of every cause stand in budget.csv."
	if len(open) > 0 {
		note += " Not given, and in no value: " + strings.Join(open, ", ") + "."
	}
	s.heading(0, note, look{color: midGrey})
	heads := []string{"Bottle", "Component", "Method", "Standard uncertainty", "Unit", "Relative, %"}
	var head []cell
	for i, h := range append(heads, causes...) {
		l := headRight
		if i < 3 || i == 4 {
			l = headIndent
		}
		head = append(head, cell{cut(plain(h), 120), l})
	}
	s.add(lineHeight("repeatability of the standards", columnPixels(12), boldLetters()), head...)
	for _, k := range order[:min(len(order), maxRows)] {
		s.add(rowHeight, r.budgetRow(k, rows[k])...)
	}
	s.table("Budget", 3, len(head))
	s.done()
}

// budgetCauses lists the causes with a size for some value, the largest shares
// first, and those that are given for none.
func (r *results) budgetCauses() (causes, open []string) {
	t := r.table["budget.csv"]
	names, rows := t.groups("cause")
	total := map[string]float64{}
	for _, name := range names {
		given := false
		for _, i := range rows[name] {
			given = given || t.Text(i, t.Col("standard_uncertainty")) != ""
			total[name] += zero(t.Float(i, t.Col("share_percent")))
		}
		if given {
			causes = append(causes, name)
		} else {
			open = append(open, name)
		}
	}
	slices.SortStableFunc(causes, func(a, b string) int { return cmp.Compare(total[b], total[a]) })
	return causes, open
}

// budgetShares gathers the shares of each value by cause, in the order of the file.
func (r *results) budgetShares(causes []string) (map[budgetKey][]cell, []budgetKey) {
	t := r.table["budget.csv"]
	rows, order := map[budgetKey][]cell{}, []budgetKey(nil)
	id, component, method, cause, share := t.Col("id"), t.Col("component"), t.Col("method"), t.Col("cause"), t.Col("share_percent")
	for i := range t.Rows {
		k := budgetKey{t.Text(i, id), t.Text(i, component), t.Text(i, method)}
		if rows[k] == nil {
			rows[k] = make([]cell, len(causes))
			order = append(order, k)
		}
		if c := slices.Index(causes, t.Text(i, cause)); c >= 0 {
			v := t.Float(i, share)
			rows[k][c] = cell{v, look{format: "0.0", hair: true}}
			if v < 0.05 {
				rows[k][c].l.color = midGrey
			}
		}
	}
	return rows, order
}

func (r *results) budgetRow(k budgetKey, shares []cell) []cell {
	hair := look{hair: true, indent: true}
	row := []cell{{visible(k.id), look{bold: true, hair: true}}, {k.component, hair}, {methodName(k.method), hair}, {nil, hair}, {nil, hair}, {nil, hair}}
	if c, unit := r.find(k); c != nil {
		relative := 100 * c.u / c.value
		row[3], row[4].v = cell{c.u, look{format: sigFormat(c.u, 2), hair: true}}, unit
		row[5] = cell{relative, look{format: sigFormat(relative, 2), hair: true}}
	}
	for i := range shares {
		shares[i].l.hair = true
	}
	return append(row, shares...)
}

// find returns a contribution and its unit; nil where there is none.
func (r *results) find(k budgetKey) (*contribution, string) {
	for _, s := range r.series {
		if b := r.byID[k.id]; b != nil && s.method == k.method && s.component == k.component {
			return b.of[s], s.unit
		}
	}
	return nil, ""
}
