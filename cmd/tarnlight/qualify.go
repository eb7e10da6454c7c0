package main

import (
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
)

// qualityFlags tells what the quality samples of resolution k show: recoveries,
// duplicates, field blanks.
func (j *job) qualityFlags(k int) []eem.Flag {
	var out []eem.Flag
	if j.res[k].Set.Method == "references" {
		out = j.recoveryFlags()
	}
	out = append(out, j.duplicateFlags(k)...)
	return append(out, j.fieldBlankFlags(k)...)
}

// allDuplicates are the duplicates of every resolution.
func (j *job) allDuplicates() []duplicate {
	var out []duplicate
	for k := range j.res {
		out = append(out, j.duplicates(k)...)
	}
	return out
}

// qualify hands the doubts that quality samples raise on to the values that they
// speak of, see concerns.
func (j *job) qualify(k int) {
	doubts := map[[2]string][]string{} // by bottle and component
	for _, f := range j.qualityFlags(k) {
		if f.Severity != eem.Doubt {
			continue
		}
		for _, id := range j.concerns(f) {
			at := [2]string{id, f.Component}
			doubts[at] = append(doubts[at], reasonOf(f, id))
		}
	}
	judged := j.judge[k]
	for _, list := range [][]unmix.Contribution{judged.Contributions, judged.Beyond} {
		for i := range list {
			c := &list[i]
			for _, name := range j.members(k, c.Component) {
				c.Doubt(doubts[[2]string{c.ID, name}]...)
			}
		}
	}
}

// reasonOf is the message of a flag, with the bottle it was raised on where that is
// another one.
func reasonOf(f eem.Flag, id string) string {
	if f.ID == id {
		return f.Msg
	}
	return f.ID + ": " + f.Msg
}

// members are the components that a contribution stands for: itself, or both of a
// sum.
func (j *job) members(k int, component string) []string {
	names := j.res[k].Set.Names()
	if slices.Contains(names, component) {
		return []string{component}
	}
	for _, a := range names {
		for _, b := range names {
			if a+" + "+b == component {
				return []string{a, b}
			}
		}
	}
	return nil
}

// concerns lists the bottles whose value of the flag's component a quality sample
// speaks of (rules of the functional guidelines, from memory):
//
//   - a field blank: the sample itself, which holds little more than the blank
//   - duplicates that differ: both of the pair, and no other
//   - a spike that was not recovered: it and the bottle that it was added to
//   - a control that was not recovered: all that its batch quantifies
//   - a standard that its own line does not give back: all that rests on the line
func (j *job) concerns(f eem.Flag) []string {
	own := j.bottle(f.ID)
	if own == nil {
		return nil
	}
	switch f.Test {
	case "duplicate", "field-duplicate":
		return []string{f.ID, own.Row.ReplicateOf}
	case "spike-recovery":
		return []string{f.ID, own.Row.SpikeOf}
	case "control-recovery":
		return j.idsOf(func(b *prepare.Bottle) bool { return b.Batch == f.Batch && b.Row.Kind != survey.Standard })
	case "standard-recovery":
		if !j.calibrates(own) {
			return []string{f.ID}
		}
		return j.idsOf(func(*prepare.Bottle) bool { return true })
	}
	return []string{f.ID}
}

func (j *job) idsOf(pass func(*prepare.Bottle) bool) []string {
	var ids []string
	for _, b := range j.sv.Pick(pass) {
		ids = append(ids, b.Row.ID)
	}
	return ids
}

// batchDoubts are the doubts and rejects that reading raised on batches as a whole.
// Every value of the batch carries them.
func (j *job) batchDoubts() map[string][]string {
	out := map[string][]string{}
	for _, f := range j.sv.Flags {
		if f.ID == "" && f.Batch != "" && f.Severity >= eem.Doubt {
			out[f.Batch] = append(out[f.Batch], "batch "+f.Batch+": "+f.Msg)
		}
	}
	return out
}

// driftOf tells that a batch borrowed blanks which do not fit it; what its standards
// calibrate is off by as much.
func (j *job) driftOf(batch string) []string {
	var out []string
	for _, f := range j.sv.Flags {
		if f.ID == "" && f.Batch == batch && f.Test == "blank-drift" && f.Severity == eem.Doubt {
			out = append(out, "standards of batch "+batch+": "+f.Msg)
		}
	}
	return out
}
