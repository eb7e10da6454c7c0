package main

import (
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix/report"
)

// table is the whole result, a row a plan and component.
func (r *planResult) table() *report.Table {
	t := &report.Table{Name: "plan.csv", Columns: []string{"scans", "excitations_nm", "emission_from_nm", "emission_to_nm", "emission_points", "minutes",
		"component", "wanted", "typical_level", "unit", "standard_uncertainty", "relative_percent", "detection_limit", "variance_inflation", "against_all_scans",
		"plan_criterion_percent", "plan_against_all_scans", "searched", "limit", "inseparable"}}
	for _, p := range append(append([]planRow{}, r.Plans...), r.Full) {
		for _, c := range p.Components {
			var limit any
			if c.Limit > 0 {
				limit = c.Limit
			}
			t.Append(p.Scans, numbersText(p.Excitations), p.Emission[0], p.Emission[1], p.Points, p.Minutes, c.Name, c.Wanted, c.Level, c.Unit,
				cellOf(c.U), cellOf(c.Percent), cellOf(c.Detection), cellOf(c.VIF), cellOf(c.AgainstAll), cellOf(p.Percent), cellOf(p.AgainstAll), p.Searched, limit, strings.Join(p.Mixed, "; "))
		}
	}
	return t
}

func cellOf(v *float64) any {
	if v == nil {
		return nil
	}
	return *v
}

// print writes the tables for a terminal: one for each quantity, and the verdict.
func (r *planResult) print(w io.Writer) error {
	for _, part := range []struct {
		title string
		of    func(c planComponent) *float64
		unit  bool
	}{
		{"Standard uncertainty at the typical level, %", func(c planComponent) *float64 { return c.Percent }, false},
		{"Detection limit in a typical bottle", func(c planComponent) *float64 { return c.Detection }, true},
		{"Variance inflation", func(c planComponent) *float64 { return c.VIF }, false},
	} {
		fmt.Fprintln(w, part.title)
		if err := r.block(part.of, part.unit).print(w); err != nil {
			return err
		}
		fmt.Fprintln(w)
	}
	if err := r.overview().print(w); err != nil {
		return err
	}
	fmt.Fprintln(w)
	for _, p := range r.Plans {
		for _, m := range p.Mixed {
			fmt.Fprintf(w, "%s: %s\n", eem.Count(p.Scans, "scan"), m)
		}
	}
	_, err := fmt.Fprintln(w, r.Verdict)
	return err
}

// block is one quantity by scans and component.
func (r *planResult) block(of func(planComponent) *float64, unit bool) *text {
	head := []string{"scans"}
	for _, c := range r.Full.Components {
		name := c.Name
		if unit && c.Unit != "" {
			name += " " + c.Unit
		}
		if !c.Wanted {
			name = "(" + name + ")"
		}
		head = append(head, name)
	}
	t := newText(head...)
	for _, p := range append(append([]planRow{}, r.Plans...), r.Full) {
		row := []string{fmt.Sprint(p.Scans)}
		for _, c := range p.Components {
			row = append(row, digits3(of(c)))
		}
		t.add(row...)
	}
	return t
}

// overview is a line a plan: what it takes and what it costs.
func (r *planResult) overview() *text {
	t := newText("scans", "minutes", "uncertainty", "of all scans'", "searched", "emission nm", "excitations nm")
	for i, p := range append(append([]planRow{}, r.Plans...), r.Full) {
		lines := numbersText(p.Excitations)
		if i == len(r.Plans) {
			lines = fmt.Sprintf("%g to %g", p.Excitations[0], p.Excitations[len(p.Excitations)-1])
		}
		percent := digits3(p.Percent)
		if p.Percent != nil {
			percent += " %"
		}
		t.add(fmt.Sprint(p.Scans), digits3(&p.Minutes), percent, digits3(p.AgainstAll), p.Searched, fmt.Sprintf("%g–%g, %d points", p.Emission[0], p.Emission[1], p.Points), lines)
	}
	return t
}

// digits3 has three significant digits, zeros among them, and nothing for what the
// scans do not tell.
func digits3(v *float64) string {
	if v == nil {
		return ""
	}
	short := fmt.Sprintf("%.2e", *v)
	e, err := strconv.Atoi(short[strings.Index(short, "e")+1:])
	if err != nil || e < -4 || e > 2 {
		return fmt.Sprintf("%.3g", *v)
	}
	return strconv.FormatFloat(*v, 'f', 2-e, 64)
}

// drawing gathers what the pictures show; scans says whose lines, 0 those of the
// verdict.
func (r *planResult) drawing(scans int) (report.PlanDrawing, error) {
	d := report.PlanDrawing{Set: r.in.problem.Set, Drawn: r.taken, Worst: r.in.problem.WorstCase}
	for _, want := range r.in.problem.Want {
		d.Apart = append(d.Apart, !want)
	}
	if d.Drawn < 0 {
		d.Drawn = len(r.Plans) - 1
	}
	found := scans == 0
	for i, p := range append(slices.Clone(r.Plans), r.Full) {
		if p.Scans == scans && !found {
			d.Drawn, found = i, true
		}
		l := report.PlanLine{Excitations: p.Excitations, Emission: p.Emission, Minutes: p.Minutes, Criterion: 100 * p.prediction.Cost}
		for f, u := range p.prediction.U {
			l.Components = append(l.Components, 100*u/r.in.problem.Level[f])
		}
		d.Lines = append(d.Lines, l)
	}
	if !found {
		return d, misuse("--draw %d: no plan has so many scans; there are plans of %d to %d", scans, r.Plans[0].Scans, r.Plans[len(r.Plans)-1].Scans)
	}
	return d, nil
}
