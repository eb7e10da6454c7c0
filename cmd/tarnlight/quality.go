package main

import (
	"fmt"
	"math"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
)

// lineFlags tells where the standards' own line does not pass through zero, and
// where it rests on few levels.
func (j *job) lineFlags() []eem.Flag {
	var out []eem.Flag
	for _, l := range j.lines {
		if t, limit, doubtful := l.Doubtful(); doubtful {
			out = append(out, j.sv.Accept(eem.Flag{Component: l.Component, Method: "references", Test: "reference-intercept", Severity: eem.Doubt,
				Value: t, Limit: limit, Msg: fmt.Sprintf("the standards of %s do not lie on a line through zero: %s; look for a blank that was not subtracted, or contaminated levels", l.Component, l)}))
		}
	}
	for _, r := range j.res {
		if r.Set.Method != "references" {
			continue
		}
		for _, c := range r.Set.Components {
			if lim := j.sv.Limit("reference-levels"); c.Levels > 0 && float64(c.Levels) < lim {
				out = append(out, j.sv.Accept(eem.Flag{Component: c.Name, Method: "references", Test: "reference-levels", Severity: eem.Remark,
					Value: float64(c.Levels), Limit: lim, Msg: fmt.Sprintf("the reference of %s rests on %d level; whether the response is a line cannot be told", c.Name, c.Levels)}))
			}
		}
	}
	return out
}

// recoveryFlags tells which controls and spikes were not found again.
func (j *job) recoveryFlags() []eem.Flag {
	var out []eem.Flag
	r := j.references0()
	if r == nil {
		return nil
	}
	for _, b := range j.sv.Bottles {
		i, ok := j.row[b]
		if !ok {
			continue
		}
		for _, g := range j.given(b, r) {
			f := indexOf(r.Set.Names(), g.component)
			if f < 0 || g.test == "" || g.given <= 0 {
				continue
			}
			recovery := 100 * (r.Value[i*r.Set.Len()+f] - g.before) / g.given
			if lim := j.sv.Limit(g.test); math.Abs(recovery-100) > lim {
				out = append(out, j.sv.Accept(eem.Flag{ID: b.Row.ID, Batch: b.Batch, Component: g.component, Method: "references", Test: g.test,
					Severity: eem.Doubt, Value: recovery, Limit: lim, Msg: fmt.Sprintf("%.1f %% of the %s given was found; accepted are %g–%g %%", recovery, g.component, 100-lim, 100+lim)}))
			}
		}
	}
	return out
}

// duplicateFlags compares each replicate with its bottle (relative percent
// difference), for components that both show.
func (j *job) duplicateFlags() []eem.Flag {
	var out []eem.Flag
	lim := j.sv.Limit("duplicate")
	for k, r := range j.res {
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
			for f, c := range r.Set.Components {
				x, y := r.Value[i*r.Set.Len()+f], r.Value[l*r.Set.Len()+f]
				// Near the detection limit a relative difference says nothing.
				least := math.Max(j.judge[k].Spreads[i].Quantifiable[f], j.judge[k].Spreads[l].Quantifiable[f])
				if !(x > least && y > least) {
					continue
				}
				if rpd := 200 * math.Abs(x-y) / (x + y); rpd > lim {
					out = append(out, j.sv.Accept(eem.Flag{ID: b.Row.ID, Batch: b.Batch, Component: c.Name, Method: r.Set.Method, Test: "duplicate",
						Severity: eem.Doubt, Value: rpd, Limit: lim, Msg: fmt.Sprintf("%s differs by %.1f %% from bottle %s, of which this is a replicate", c.Name, rpd, of.Row.ID)}))
				}
			}
		}
	}
	return append(out, j.fieldBlankFlags()...)
}

// fieldBlankFlags tells what was found in field blanks.
func (j *job) fieldBlankFlags() []eem.Flag {
	var out []eem.Flag
	for k, r := range j.res {
		for _, c := range j.judge[k].Contributions {
			b := j.bottle(c.ID)
			if b.Row.Kind != survey.FieldBlank || !c.Detected || !(c.Value > c.Quantification) {
				continue
			}
			out = append(out, j.sv.Accept(eem.Flag{ID: c.ID, Batch: b.Batch, Component: c.Component, Method: r.Set.Method, Test: "field-blank",
				Severity: eem.Remark, Value: c.Value, Limit: c.Quantification,
				Msg: fmt.Sprintf("%s was found in the field blank: %s %s", c.Component, c.Reported, c.Unit)}))
		}
	}
	return out
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

func indexOf(list []string, s string) int {
	for i, v := range list {
		if v == s {
			return i
		}
	}
	return -1
}
