package main

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
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

// study holds what a survey says about limits by repeated measurements.
type study struct {
	j      *job
	k      int // of the resolution
	signed map[*prepare.Bottle][]float64
	groups [][]*prepare.Bottle // a bottle and its laboratory replicates
}

// studyOf gathers blanks, field blanks and standards of resolution k as least
// squares sees them.
func (j *job) studyOf(k int) *study {
	s := &study{j: j, k: k, signed: map[*prepare.Bottle][]float64{}}
	var bottles []*prepare.Bottle
	var rows []int
	for _, b := range j.sv.Bottles {
		if s.takesPart(b) && (b.Row.Kind == survey.Blank || b.Row.Kind == survey.FieldBlank || b.Row.Kind == survey.Standard) {
			bottles, rows = append(bottles, b), append(rows, j.row[b])
		}
	}
	for i, v := range merit.Signed(j.cube, j.res[k].Set, rows) {
		s.signed[bottles[i]] = v
	}
	s.group()
	return s
}

// group finds the bottles with replicates. One that was filled again is not among
// them: that scatter is not the method's.
func (s *study) group() {
	byID := map[string]*prepare.Bottle{}
	for _, b := range s.j.sv.Bottles {
		byID[b.Row.ID] = b
	}
	at := map[*prepare.Bottle]int{}
	for _, b := range s.j.sv.Bottles {
		root := b
		for root != nil && root.Row.ReplicateOf != "" {
			if root.Row.ReplicateKind == survey.Field {
				root = nil
				break
			}
			root = byID[root.Row.ReplicateOf]
		}
		if root == nil || !s.takesPart(b) || b.Undiluted() != root.Undiluted() {
			continue
		}
		i, ok := at[root]
		if !ok {
			i = len(s.groups)
			at[root] = i
			s.groups = append(s.groups, nil)
		}
		s.groups[i] = append(s.groups[i], b)
	}
	s.joinControls()
	s.groups = slices.DeleteFunc(s.groups, func(g []*prepare.Bottle) bool { return len(g) < 2 })
}

func (s *study) takesPart(b *prepare.Bottle) bool {
	i, ok := s.j.row[b]
	return ok && b.Usable() && b.Row.ExcludeFromFit == "" && s.j.res[s.k].Fits[i].Usable
}

// bases are the published forms for component f.
func (s *study) bases(f int) []merit.Basis {
	out := s.replicates(f)
	out = append(out, s.blanks(f)...)
	if b, ok := s.standards(f); ok {
		out = append(out, b)
	}
	return out
}

// batched sorts values into batches in their order of appearance.
type batched struct {
	names  []string
	values [][]float64
}

func (g *batched) add(batch string, v float64) {
	if v != v {
		return
	}
	i := slices.Index(g.names, batch)
	if i < 0 {
		i = len(g.names)
		g.names, g.values = append(g.names, batch), append(g.values, nil)
	}
	g.values[i] = append(g.values[i], v)
}

// blanks are those that were subtracted, by the mean that they are part of, and
// field blanks, which are handled like a sample.
func (s *study) blanks(f int) []merit.Basis {
	var own, field batched
	for _, b := range s.j.sv.Bottles {
		v, ok := s.signed[b]
		switch {
		case !ok:
		case b.Row.Kind == survey.Blank && b.BlankSet != "":
			own.add(b.BlankSet, v[f])
		case b.Row.Kind == survey.Blank:
			own.add(b.Batch, v[f])
		case b.Row.Kind == survey.FieldBlank:
			field.add(b.Batch, v[f])
		}
	}
	var out []merit.Basis
	if len(own.values) > 0 {
		in := math.MaxInt
		for _, v := range own.values {
			in = min(in, len(v))
		}
		out = append(out, merit.FromBlanks(basisBlanks, own.values, in)...)
	}
	if len(field.values) > 0 {
		out = append(out, merit.FromBlanks(basisFieldBlanks, field.values, 0)...)
	}
	return out
}

// standards are the levels given of component f.
func (s *study) standards(f int) (merit.Basis, bool) {
	name := s.j.res[s.k].Set.Components[f].Name
	var x, y []float64
	batches := map[string]bool{}
	for _, b := range s.j.sv.Bottles {
		v, ok := s.signed[b]
		at := slices.IndexFunc(b.Row.Conc, func(c survey.Conc) bool { return c.Name == name })
		if !ok || at < 0 || b.Row.Kind != survey.Standard || v[f] != v[f] {
			continue
		}
		x, y = append(x, b.Row.Conc[at].Value*b.Undiluted()), append(y, v[f])
		batches[b.Batch] = true
	}
	if len(x) == 0 {
		return merit.Basis{}, false
	}
	return merit.FromStandards(x, y, len(batches)), true
}

// replicates are the limits by the bottle and its replicates that suit best: not
// refused, and the lowest of those; else the one with most replicates.
func (s *study) replicates(f int) []merit.Basis {
	var best []merit.Basis
	better := func(a, b merit.Basis) bool {
		if (a.Refused == "") != (b.Refused == "") {
			return a.Refused == ""
		}
		if a.Refused == "" {
			return a.Mean < b.Mean
		}
		return a.N > b.N
	}
	for _, g := range s.groups {
		if b := s.judge(g, f); b != nil && (best == nil || better(b[0], best[0])) {
			best = b
		}
	}
	return best
}

// judge gives the limits by a group of replicates; nil where they are not meant to
// hold component f, or hold none.
func (s *study) judge(group []*prepare.Bottle, f int) []merit.Basis {
	of := group[0].Row
	name, n := s.j.res[s.k].Set.Components[f].Name, s.j.res[s.k].Set.Len()
	given := nan
	if at := slices.IndexFunc(of.Conc, func(c survey.Conc) bool { return c.Name == name }); at >= 0 && of.Kind != survey.Spike {
		given = of.Conc[at].Value * group[0].Undiluted()
	}
	known := of.Kind == survey.Standard || of.Kind == survey.Control
	if of.Kind == survey.Blank || of.Kind == survey.FieldBlank || known && !(given > 0) {
		return nil
	}
	var g batched
	made := false
	for _, b := range group {
		i := s.j.row[b]
		v := s.j.res[s.k].Value[i*n+f]
		if !known && !(v > s.j.judge[s.k].Spreads[i].Critical[f]) {
			return nil
		}
		g.add(b.Batch, v)
		made = made || s.j.calibrates(b)
	}
	out := merit.FromReplicates(basisOf(group), given, g.values)
	for i := range out {
		if made && out[i].Refused == "" {
			out[i].Refused = "they are part of the line of the standards, which follows them; give them the kind control"
		}
	}
	return out
}
