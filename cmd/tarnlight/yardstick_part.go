package main

import (
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// holdAgainst gives every bottle's spread what its residual is held against, and
// returns that of all setups together, which a model file carries. Noise is the
// instrument's: replicates speak for the bottles of their setup. A fixed model brings
// what its own bottles showed.
func (j *job) holdAgainst(r *unmix.Resolution, spreads []merit.Spread) *unmix.Yardstick {
	if j.applied != nil {
		for i := range spreads {
			spreads[i].Yard = j.applied.Yardstick
		}
		return j.applied.Yardstick
	}
	per := map[string]*unmix.Yardstick{}
	for b, i := range j.row {
		name := b.Row.Setup
		if per[name] == nil {
			per[name] = merit.NewYardstick(j.cube, r, j.pairs(func(setup string) bool { return setup == name }))
		}
		spreads[i].Yard = per[name]
	}
	return merit.NewYardstick(j.cube, r, j.pairs(func(string) bool { return true }))
}

// pairs lists, of the setups to keep, the rows of bottles and their laboratory
// replicates at one dilution, whose residuals differ by noise alone.
func (j *job) pairs(keep func(setup string) bool) [][2]int {
	var out [][2]int
	for _, b := range j.sv.Bottles {
		if b.Row.ReplicateOf == "" || b.Row.ReplicateKind == survey.Field || !keep(b.Row.Setup) {
			continue
		}
		of := j.bottle(b.Row.ReplicateOf)
		i, ok1 := j.row[b]
		l, ok2 := j.row[of]
		if ok1 && ok2 && b.Row.Setup == of.Row.Setup && b.Undiluted() == of.Undiluted() && !bent(b) && !bent(of) {
			out = append(out, [2]int{i, l})
		}
	}
	return out
}
