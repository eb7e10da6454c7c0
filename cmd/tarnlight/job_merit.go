package main

import (
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// resolveWith resolves every usable bottle against a set and judges the result.
// more, if given, raises flags on single bottles from the resolution itself; they
// count in the judgement.
func (j *job) resolveWith(set *unmix.Set, method string, more func(*unmix.Resolution) []eem.Flag) error {
	set.Method = method
	if err := j.readLimits(set); err != nil {
		return err
	}
	r, err := unmix.Quantify(j.cube, set)
	if err != nil {
		return err
	}
	var extra []eem.Flag
	if more != nil {
		extra = more(r)
		j.flags = append(j.flags, extra...)
	}
	bottles := make([]merit.Bottle, 0, len(j.sv.Bottles))
	for _, b := range j.sv.Bottles {
		if b.Excluded {
			continue
		}
		bottles = append(bottles, j.merit(b))
	}
	j.reach(bottles, method, extra)
	src := j.sources(r)
	spreads := merit.Spreads(j.cube, r, src)
	yard := j.holdAgainst(r, spreads)
	judged := merit.Judge(r, spreads, bottles, j.cube.Sample, j.sv.Limit, j.sv.Accept, set.Origin)
	if err := j.unknowns(judged, r, bottles, src, set.Origin); err != nil {
		return err
	}
	judged.Round(j.set.Report.Digits)
	j.res = append(j.res, r)
	j.judge = append(j.judge, judged)
	j.yards = append(j.yards, yard)
	j.src = append(j.src, src)
	j.qualify(len(j.res) - 1)
	return nil
}

// reach hands doubts on to the bottles that they concern: flags on one bottle,
// and those on the model or the references of a method, which every value used.
// A standard's doubt reaches the components that it stands for; cells that were
// left out of the reference for it do no harm.
func (j *job) reach(bottles []merit.Bottle, method string, extra []eem.Flag) {
	all := map[string][]string{} // component, empty for all of them
	for _, f := range j.flags {
		if f.ID == "" && f.Severity == eem.Doubt && f.Method == method {
			all[f.Component] = append(all[f.Component], f.Msg)
		}
	}
	for _, b := range j.sv.Bottles {
		if method != "references" || j.refs == nil || !j.calibrates(b) || !b.Usable() {
			continue
		}
		for _, c := range b.Row.Conc {
			for _, msg := range j.driftOf(b.Batch) {
				if c.Value > 0 && !slices.Contains(all[c.Name], msg) {
					all[c.Name] = append(all[c.Name], msg)
				}
			}
		}
		for _, f := range b.Flags {
			if f.Severity != eem.Doubt || f.Test == "saturated" || f.Test == "absorbance-limit" {
				continue
			}
			for _, c := range b.Row.Conc {
				if c.Value > 0 {
					all[c.Name] = append(all[c.Name], "standard "+b.Row.ID+": "+f.Msg)
				}
			}
		}
	}
	batch := j.batchDoubts()
	for i := range bottles {
		bottles[i].Doubts = append(bottles[i].Doubts, batch[bottles[i].Batch]...)
		for _, f := range extra {
			if f.ID == bottles[i].ID && f.Severity == eem.Doubt {
				bottles[i].Doubts = append(bottles[i].Doubts, f.Msg)
			}
		}
		bottles[i].Doubts = append(bottles[i].Doubts, all[""]...)
		bottles[i].Of = all
	}
}

// merit gathers what the judgement of a bottle needs.
func (j *job) merit(b *prepare.Bottle) merit.Bottle {
	m := merit.Bottle{ID: b.Row.ID, Batch: b.Batch, Row: -1, Unlike: b.Row.Kind == survey.Blank || b.Row.Kind == survey.FieldBlank,
		Standard: b.Row.Kind == survey.Standard, Lines: scatterLines(b)}
	if i, ok := j.row[b]; ok {
		m.Row = i
	}
	for _, f := range b.Flags {
		switch f.Severity {
		case eem.Doubt:
			m.Doubts = append(m.Doubts, f.Msg)
		case eem.Reject:
			m.Rejects = append(m.Rejects, f.Msg)
		}
	}
	return m
}
