package main

import (
	"fmt"
	"math"
	"path/filepath"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

// sources lists row, files, absorbance, blanks and scale.
func (x *explainer) sources() {
	b := x.bottle
	x.add("bottle", "id", b.Row.ID, "", string(b.Row.Kind))
	x.add("bottle", "batch", b.Batch, "", b.Row.Setup)
	x.add("bottle", "dilution", report.Number(b.Row.Dilution), "", "final over sample volume")
	if b.Absorb == nil {
		x.add("bottle", "absorbance", "none", "", "")
	} else {
		x.add("bottle", "absorbance at 254 nm", report.Number(b.Absorb.PerCM(254)), "per cm", "of the bottle, undiluted")
		x.add("bottle", "largest inner-filter factor", report.Number(b.Largest), "", "")
	}
	if !math.IsNaN(b.Scale()) {
		x.add("bottle", "divided by", report.Number(b.Scale()), "counts nm", "intensity scale")
	}
	var blanks []string
	for _, o := range b.Blanks() {
		blanks = append(blanks, o.Row.ID)
	}
	x.add("bottle", "blanks", strings.Join(blanks, " "), "", "")
	for i, f := range b.Files {
		if i == 3 && len(b.Files) > 4 {
			x.add("files", fmt.Sprintf("and %d more", len(b.Files)-3), "", "", "provenance.json lists all")
			break
		}
		x.add("files", f.Path, fmt.Sprint(f.Size), "bytes", "sha256 "+f.SHA256[:16]+"…")
	}
}

// tables adds what the result tables say of the bottle.
func (x *explainer) tables() error {
	count := map[eem.Reason]int{}
	for _, w := range x.sample.Why {
		count[w]++
	}
	for r := range eem.NumReasons {
		if count[r] > 0 {
			x.add("cells", r.String(), fmt.Sprint(count[r]), fmt.Sprintf("of %d", len(x.sample.Why)), "")
		}
	}
	c, err := report.ReadTable(filepath.Join(x.out, "contributions.csv"))
	if err != nil {
		return err
	}
	f, err := report.ReadTable(filepath.Join(x.out, "flags.csv"))
	if err != nil {
		return err
	}
	for r := range c.Rows {
		get := func(col string) string { return c.Text(r, c.Col(col)) }
		if get("id") != x.id {
			continue
		}
		at := func(col string) float64 { return c.Float(r, c.Col(col)) }
		note := "reported " + asReported(get("reported"), get("qualifier"), at("value"), at("standard_uncertainty"), at("lower95"), at("upper95"), x.digits)
		if why := x.untold(f, get("reasons")); why != "" {
			note += "; " + why
		}
		x.add("contributions ("+get("method")+", "+get("model")+")", get("component"), get("value"), get("unit"), note)
	}
	x.flags(f)
	return x.changed()
}

// asReported is a contribution as it goes into a report, with its expanded
// uncertainty to the same decimal.
func asReported(reported, qualifier string, value, u, lower, upper float64, digits int) string {
	if _, err := strconv.ParseFloat(reported, 64); err == nil && u > 0 {
		expanded := unmix.ExpandedOf(value, u, lower, upper)
		reported = fmt.Sprintf("%s ± %s (k = %.1f)", merit.Rounded(value, expanded, digits), merit.RoundedExpanded(value, expanded, digits), expanded/u)
	}
	if qualifier != "" {
		reported += ", " + qualifier
	}
	return reported
}

// reaches says whether a finding is the bottle's or one on more bottles, its own
// batch or the survey.
func (x *explainer) reaches(f *report.Table, r int) bool {
	id, batch := f.Text(r, f.Col("id")), f.Text(r, f.Col("batch"))
	return id == x.id || id == "" && (batch == "" || batch == x.bottle.Batch)
}

// untold are the reasons that no finding on the bottle tells, which are shown below.
func (x *explainer) untold(f *report.Table, reasons string) string {
	for r := range f.Rows {
		if m := f.Text(r, f.Col("message")); m != "" && x.reaches(f, r) {
			reasons = strings.ReplaceAll(reasons, m, "")
		}
	}
	return strings.Join(report.Leftover(reasons), "; ")
}

// flags adds the bottle's findings, and the doubts that it shares with others.
func (x *explainer) flags(f *report.Table) {
	for r := range f.Rows {
		section, severity := "flags", f.Text(r, f.Col("severity"))
		if f.Text(r, f.Col("id")) == "" {
			if severity != eem.Doubt.String() && severity != eem.Reject.String() {
				continue
			}
			section = "flags on all bottles"
			if b := f.Text(r, f.Col("batch")); b != "" {
				section = "flags on batch " + b
			}
		}
		if x.reaches(f, r) {
			x.add(section, f.Text(r, f.Col("test")), severity, "", f.Text(r, f.Col("message")))
		}
	}
}
