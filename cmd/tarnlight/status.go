package main

import (
	"fmt"

	"tarnlight/eem"
)

// status is status.json: the outcome for a scheduler.
type status struct {
	Outcome  string         `json:"outcome"` // done, doubt
	ExitCode int            `json:"exit_code"`
	Version  string         `json:"version"`
	Title    string         `json:"title"`
	Unit     string         `json:"unit"`
	Methods  []string       `json:"methods"`
	Bottles  map[string]int `json:"bottles"` // all, usable, rejected, excluded; since_last: new, new_usable … of those that the former results lack
	Findings map[string]int `json:"findings"`
	Tests    map[string]int `json:"tests"` // doubts and rejects by code
	Rejected []string       `json:"rejected"`
	Reasons  []string       `json:"reasons"` // the first ones, rejects first; what many share is one

	Concerns  map[string][]string `json:"concerns"`   // ids with doubts and rejects, by instrument, model, limit, data
	SinceLast bool                `json:"since_last"` // findings to concerns, and reason_groups, speak of bottles that the former results lack

	ReasonGroups []reason `json:"reason_groups"` // all reasons, with how many share each
}

// countBottles counts all bottles by their state and, where the status speaks of what
// the former results lack, the new ones by theirs.
func (s *status) countBottles(j *job) {
	if s.SinceLast {
		for _, k := range []string{"new", "new_usable", "new_rejected", "new_excluded"} {
			s.Bottles[k] = 0
		}
	}
	rejected := j.rejected()
	for _, b := range j.sv.Bottles {
		state := "usable"
		switch {
		case b.Excluded:
			state = "excluded"
		case rejected[b.Row.ID]:
			state = "rejected"
		}
		s.Bottles[state]++
		if j.old[b.Row.ID] {
			continue
		}
		if state == "rejected" {
			s.Rejected = append(s.Rejected, b.Row.ID)
		}
		if s.SinceLast {
			s.Bottles["new"]++
			s.Bottles["new_"+state]++
		}
	}
}

// rejected lists the bottles of which nothing can be used.
func (j *job) rejected() map[string]bool {
	out := map[string]bool{}
	for _, f := range j.flags {
		if f.Severity == eem.Reject && f.ID != "" {
			out[f.ID] = true
		}
	}
	return out
}

func flagLine(f eem.Flag) string {
	return fmt.Sprintf("%s: %s (%s)", flagged(f), f.Msg, f.Test)
}
