package main

import (
	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

// sources gathers what is known of the errors behind the contributions of a
// resolution.
func (j *job) sources(r *unmix.Resolution) *merit.Sources {
	n := j.cube.Len()
	s := &merit.Sources{Causes: make([][]eem.Cause, n), BlankSet: make([]string, n), Factor: make([]float64, n), Blank: make([]bool, n),
		BlankU: j.sv.BlankU, Seed: j.set.Resolve.Seed, Limits: j.limits}
	for b, i := range j.row {
		s.Causes[i], s.BlankSet[i], s.Factor[i], s.Blank[i] = b.Causes, b.BlankSet, b.Undiluted(), b.Row.Kind == survey.Blank
	}
	switch r.Set.Method {
	case "references":
		s.References = j.refs
		s.Scatter = merit.Scatters(j.cube, r, s)
		if d := j.set.Uncertainty.StandardsPercent; d.Given {
			s.Stock = d.Value / 100
		} else {
			s.StockMissing = true
		}
	case "parafac":
		if m := j.fit.Moves(); m > 0 {
			s.Loadings = &merit.Loadings{Samples: m, Move: j.fit.Move}
			s.Loadings.BentEx, s.Loadings.BentEm = j.fit.Bent()
		}
	}
	return s
}

// budgetTable makes budget.csv: the causes behind every standard uncertainty,
// largest first, then those that act and were not stated.
func (j *job) budgetTable() *report.Table {
	t := report.New("budget.csv")
	for k, judged := range j.judge {
		r := j.res[k]
		for i, id := range r.IDs {
			s := judged.Spreads[i]
			for f, c := range r.Set.Components {
				unit := c.AmountUnit
				if unit == "" {
					unit = string(r.Set.Unit)
				}
				for _, term := range s.Largest(f) {
					var df any
					if term.DF > 0 {
						df = term.DF
					}
					if term.U == nil {
						t.Append(id, c.Name, r.Set.Method, term.Cause, term.Scope, "", unit, "", df, term.Source)
					} else if u := term.U[f]; u > 0 {
						t.Append(id, c.Name, r.Set.Method, term.Cause, term.Scope, u, unit, 100*u*u/(s.U[f]*s.U[f]), df, term.Source)
					}
				}
			}
		}
	}
	return t
}
