package main

import (
	"fmt"
	"math"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
)

// duplicate is the relative difference of a replicate and its bottle in one
// component.
type duplicate struct {
	bottle, of        *prepare.Bottle
	component, method string
	rpd, limit        float64 // %
	test              string  // duplicate, or field-duplicate for a second bottle
}

// plainly is how many detection limits two values must be above before their relative
// difference says something (METHODS 9.1 asks for 5 reporting limits, from memory).
const plainly = 3

// duplicates compares each replicate with its bottle, for components that both
// show plainly: near the detection limit a relative difference says nothing.
func (j *job) duplicates(k int) []duplicate {
	var out []duplicate
	r, spreads := j.res[k], j.judge[k].Spreads
	n := r.Set.Len()
	for _, b := range j.sv.Bottles {
		if b.Row.ReplicateOf == "" {
			continue
		}
		i, ok1 := j.row[b]
		of := j.bottle(b.Row.ReplicateOf)
		l, ok2 := j.row[of]
		if !ok1 || !ok2 {
			continue
		}
		test := "duplicate"
		if b.Row.ReplicateKind == survey.Field {
			test = "field-duplicate"
		}
		for f, c := range r.Set.Components {
			x, y := r.Value[i*n+f], r.Value[l*n+f]
			if least := plainly * math.Max(spreads[i].Detection[f], spreads[l].Detection[f]); x > least && y > least {
				out = append(out, duplicate{b, of, c.Name, r.Set.Method, rpd(x, y), j.sv.Limit(test), test})
			}
		}
	}
	return out
}

// rpd is the relative percent difference of two values, 100·|x − y| over their mean.
func rpd(x, y float64) float64 { return 200 * math.Abs(x-y) / (x + y) }

// duplicateFlags tells which duplicates differ by more than their limit.
func (j *job) duplicateFlags(k int) []eem.Flag {
	var out []eem.Flag
	for _, d := range j.duplicates(k) {
		if d.rpd > d.limit {
			what := map[string]string{"duplicate": "of which this is a replicate", "field-duplicate": "filled at the same place"}[d.test]
			out = append(out, j.sv.Accept(eem.Flag{ID: d.bottle.Row.ID, Batch: d.bottle.Batch, Component: d.component, Method: d.method, Test: d.test,
				Severity: eem.Doubt, Value: d.rpd, Limit: d.limit, Msg: fmt.Sprintf("%s differs by %.1f %% from bottle %s, %s", d.component, d.rpd, d.of.Row.ID, what)}))
		}
	}
	return out
}

// foundInBlank is the most that a field blank of a batch holds of a component.
type foundInBlank struct {
	value float64
	id    string
}

// fieldBlankFlags tells what resolution k found in field blanks, and which bottles
// of their batch hold little more of it.
func (j *job) fieldBlankFlags(k int) []eem.Flag {
	out, worst := j.foundInBlanks(k)
	limit := j.sv.Limit("field-blank")
	for _, c := range j.judge[k].Contributions {
		b := j.bottle(c.ID)
		w, ok := worst[[2]string{b.Batch, c.Component}]
		if !ok || b.Row.Kind != survey.Sample || !c.Detected || !(c.Value < limit*w.value) {
			continue
		}
		out = append(out, j.sv.Accept(eem.Flag{ID: c.ID, Batch: b.Batch, Component: c.Component, Method: c.Method, Test: "field-blank",
			Severity: eem.Doubt, Value: c.Value / w.value, Limit: limit,
			Msg: fmt.Sprintf("%s is only %.2g times what field blank %s holds (limit %g); part of it may come from handling", c.Component, c.Value/w.value, w.id, limit)}))
	}
	return out
}

// foundInBlanks notes what field blanks hold above the quantification limit; worst
// is by batch and component.
func (j *job) foundInBlanks(k int) (out []eem.Flag, worst map[[2]string]foundInBlank) {
	worst = map[[2]string]foundInBlank{}
	for _, c := range j.judge[k].Contributions {
		b := j.bottle(c.ID)
		if b.Row.Kind != survey.FieldBlank || !c.Detected || !(c.Value > c.Quantification) {
			continue
		}
		if at := [2]string{b.Batch, c.Component}; c.Value > worst[at].value {
			worst[at] = foundInBlank{c.Value, c.ID}
		}
		out = append(out, j.sv.Accept(eem.Flag{ID: c.ID, Batch: b.Batch, Component: c.Component, Method: c.Method, Test: "field-blank",
			Severity: eem.Remark, Value: c.Value, Limit: c.Quantification,
			Msg: fmt.Sprintf("%s was found in the field blank: %s %s", c.Component, c.Reported, c.Unit)}))
	}
	return out, worst
}

// references0 is the resolution against references, nil where there is none.
func (j *job) references0() *unmix.Resolution {
	for _, r := range j.res {
		if r.Set.Method == "references" {
			return r
		}
	}
	return nil
}
