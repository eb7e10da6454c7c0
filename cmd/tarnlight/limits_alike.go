package main

import (
	"fmt"

	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// joinControls makes one group of the controls of one setup that hold the same
// amounts: whoever makes nine alike need not name the first in the eight others.
func (s *study) joinControls() {
	first := map[string]int{}
	for i, g := range s.groups {
		holds := amountsOf(g[0])
		if g[0].Row.Kind != survey.Control || holds == "" {
			continue
		}
		holds += " in " + g[0].Row.Setup
		if at, ok := first[holds]; ok {
			s.groups[at], s.groups[i] = append(s.groups[at], g...), nil
		} else {
			first[holds] = i
		}
	}
}

// amountsOf lists the amounts that a bottle was given, before dilution and in the order
// of the sheet's columns; empty where it was given nothing.
func amountsOf(b *prepare.Bottle) string {
	out := ""
	for _, c := range b.Row.Conc {
		if c.Value > 0 {
			out += fmt.Sprintf("%s %.9g, ", c.Name, c.Value*b.Undiluted())
		}
	}
	return out
}

// basisOf names a group of replicates.
func basisOf(group []*prepare.Bottle) string {
	for _, b := range group[1:] {
		if b.Row.Kind == survey.Control && b.Row.ReplicateOf == "" {
			return "controls alike with " + group[0].Row.ID
		}
	}
	return "replicates of " + group[0].Row.ID
}
