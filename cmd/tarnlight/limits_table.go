package main

import (
	"fmt"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

// limitsTable makes limits.csv: for every component the limits of this survey, the
// laboratory's own, and beside them the published forms with what they rest on.
func (j *job) limitsTable() *report.Table {
	t := report.New("limits.csv")
	for k, r := range j.res {
		s := j.studyOf(k)
		for f, c := range r.Set.Components {
			unit := c.AmountUnit
			if unit == "" {
				unit = string(r.Set.Unit)
			}
			for _, b := range slices.Concat(j.limitsHere(k, f), s.bases(f)) {
				appendBasis(t, c.Name, r.Set.Method, unit, b)
			}
		}
	}
	return t
}

func appendBasis(t *report.Table, component, method, unit string, b merit.Basis) {
	note := b.Refused
	if note == "" {
		note = b.Remark
	}
	var values []string
	for _, batch := range b.Values {
		var v []string
		for _, x := range batch {
			v = append(v, fmt.Sprintf("%.6g", x))
		}
		values = append(values, strings.Join(v, " "))
	}
	t.Append(component, method, b.Form, b.On, b.N, b.Batches, b.Given, b.Mean, b.SD, b.Within, b.Between, b.Total, b.DF,
		b.Critical, b.Detection, b.Quantification, unit, b.Refused == "", note, strings.Join(values, " | "), b.Source)
}

// Forms of limits.csv beside those of merit.
const (
	formSurvey     = "this survey"
	formLaboratory = "laboratory"
)

// Bases of limits.csv that are blanks.
const (
	basisBlanks      = "blanks, within a batch"
	basisFieldBlanks = "field blanks"
)

// limitsHere are the limits that the budgets of this survey's samples give, and the
// laboratory's own where it has some.
func (j *job) limitsHere(k, f int) []merit.Basis {
	var critical, detection, quantification []float64
	batches := map[string]bool{}
	for _, b := range j.sv.Bottles {
		i, ok := j.row[b]
		if !ok || b.Row.Kind != survey.Sample {
			continue
		}
		l := budgetLimits(&j.judge[k].Spreads[i], f)
		if !(l.Detection > 0) {
			continue
		}
		critical, detection = append(critical, l.Critical), append(detection, l.Detection)
		if l.Quantification > 0 {
			quantification = append(quantification, l.Quantification)
		}
		batches[b.Batch] = true
	}
	here := merit.Basis{Form: formSurvey, On: "median of the samples", Source: "budget of each bottle without the component; factors after Currie 1968 and ISO 11843-2",
		Given: nan, Repeats: merit.Repeats{N: len(detection), Batches: len(batches), Mean: nan, SD: nan, Within: nan, Between: nan, Total: nan, DF: nan},
		Limits: merit.Limits{Critical: middle(critical), Detection: middle(detection), Quantification: middle(quantification)}}
	if len(detection) > 0 {
		here.Remark = fmt.Sprintf("detection limits from %s to %s", short(slices.Min(detection)), short(slices.Max(detection)))
	}
	out := []merit.Basis{here}
	if own, ok := j.limits[j.res[k].Set.Components[f].Name]; ok {
		lab := here
		lab.Form, lab.On, lab.Source, lab.Remark, lab.Limits = formLaboratory, j.set.Quantify.Limits, "settings: quantify.limits", "in force in the place of the survey's own", own
		out = append(out, lab)
	}
	return out
}

// budgetLimits are the limits that a bottle's budget gives, whatever the laboratory
// says.
func budgetLimits(s *merit.Spread, f int) merit.Limits {
	if s.Computed != nil && s.Computed[f].Detection > 0 {
		return s.Computed[f]
	}
	return merit.Limits{Critical: s.Critical[f], Detection: s.Detection[f], Quantification: s.Quantifiable[f]}
}

// limitsLowFlags tells of the laboratory's limits that lie far below what the
// samples' budgets give.
func (j *job) limitsLowFlags() []eem.Flag {
	var out []eem.Flag
	limit := j.sv.Limit("limits-low")
	for k, r := range j.res {
		for f, c := range r.Set.Components {
			own, ok := j.limits[c.Name]
			if !ok {
				continue
			}
			here := j.limitsHere(k, f)[0]
			if ratio := here.Critical / own.Critical; ratio > limit {
				out = append(out, j.sv.Accept(eem.Flag{Component: c.Name, Method: r.Set.Method, Test: "limits-low", Severity: eem.Remark, Value: ratio, Limit: limit,
					Msg: fmt.Sprintf("the laboratory's critical value of %s, %s, is %s times below the one that the budgets of the samples give (%s): more than 5 %% of bottles without it will be called detected; make the limits in a water like theirs",
						c.Name, short(own.Critical), short(ratio), short(here.Critical))}))
			}
		}
	}
	return out
}

// middle is the median, NaN of none.
func middle(v []float64) float64 {
	if len(v) == 0 {
		return nan
	}
	slices.Sort(v)
	return median(v)
}
