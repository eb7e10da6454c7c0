package main

import (
	"fmt"
	"slices"

	"tarnlight/eem"
)

// reason is what is said alike of one bottle or of many.
type reason struct {
	Severity string   `json:"severity"`
	Test     string   `json:"test"`
	Concern  string   `json:"concern"` // as in concerns of status
	Count    int      `json:"count"`   // of bottles and batches
	IDs      []string `json:"ids"`     // the first of them
	Message  string   `json:"message"` // of the first
	same     bool     // of all of them
}

// fewIDs is how many ids a reason lists.
const fewIDs = 8

// reasonsOf puts findings of one test together: those that say the same, and all of
// them where more than a few say different things. They come in the order of the
// findings.
func reasonsOf(flags []eem.Flag) []reason {
	type key struct {
		severity  eem.Severity
		test, msg string
	}
	said := map[key]map[string]bool{} // test → messages
	for _, f := range flags {
		k := key{f.Severity, f.Test, ""}
		if said[k] == nil {
			said[k] = map[string]bool{}
		}
		said[k][f.Msg] = true
	}
	at := map[key]int{}
	ids := map[key]map[string]bool{}
	out := []reason{}
	for _, f := range flags {
		k := key{f.Severity, f.Test, f.Msg}
		differ := len(said[key{f.Severity, f.Test, ""}]) > few
		if differ {
			k.msg = ""
		}
		i, there := at[k]
		if !there {
			i = len(out)
			at[k], ids[k] = i, map[string]bool{}
			out = append(out, reason{Severity: f.Severity.String(), Test: f.Test, Concern: concernOf(f.Test), Message: f.Msg, IDs: []string{}, same: !differ})
		}
		if who := flagged(f); !ids[k][who] {
			ids[k][who] = true
			if out[i].Count++; len(out[i].IDs) < fewIDs {
				out[i].IDs = append(out[i].IDs, who)
			}
		}
	}
	return out
}

// line tells a reason to people.
func (r reason) line() string {
	if r.Count == 1 {
		return fmt.Sprintf("%s: %s (%s)", r.IDs[0], eem.Brief(r.Message), r.Test)
	}
	who := some(r.IDs)
	if more := r.Count - len(r.IDs); more > 0 {
		who += fmt.Sprintf(" and %d more", more)
	}
	if !r.same {
		return fmt.Sprintf("%d of one kind (%s), such as %s: %s (%s)", r.Count, who, r.IDs[0], eem.Brief(r.Message), r.Test)
	}
	return fmt.Sprintf("%d of one kind (%s): %s (%s)", r.Count, who, eem.Brief(r.Message), r.Test)
}

// worst returns the findings that a user must see, one for each bottle and test:
// what concerns the whole survey or a batch, then rejects, then doubts.
func (j *job) worst() []eem.Flag {
	var out []eem.Flag
	seen := map[[2]string]bool{}
	take := func(pass func(eem.Flag) bool) {
		for _, f := range j.news() {
			if k := [2]string{flagged(f), f.Test}; pass(f) && !seen[k] {
				seen[k] = true
				out = append(out, f)
			}
		}
	}
	take(func(f eem.Flag) bool { return f.ID == "" && f.Severity >= eem.Doubt })
	take(func(f eem.Flag) bool { return f.Severity == eem.Reject })
	take(func(f eem.Flag) bool { return f.Severity == eem.Doubt })
	return slices.Clip(out)
}
