package main

import (
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// yardstick is what the residuals of r are held against: differences of replicates,
// or, for a fixed model, what the model's own bottles showed.
func (j *job) yardstick(r *unmix.Resolution) *unmix.Yardstick {
	if j.applied != nil {
		return j.applied.Yardstick
	}
	return merit.NewYardstick(j.cube, r, j.pairs())
}

// pairs lists the rows of bottles and their laboratory replicates at one dilution,
// whose residuals differ by noise alone.
func (j *job) pairs() [][2]int {
	var out [][2]int
	for _, b := range j.sv.Bottles {
		if b.Row.ReplicateOf == "" || b.Row.ReplicateKind == survey.Field {
			continue
		}
		of := j.bottle(b.Row.ReplicateOf)
		i, ok1 := j.row[b]
		l, ok2 := j.row[of]
		if ok1 && ok2 && b.Undiluted() == of.Undiluted() && !bent(b) && !bent(of) {
			out = append(out, [2]int{i, l})
		}
	}
	return out
}
