package synth

import (
	"math/rand/v2"

	"tarnlight/eem"
)

// rayleighMask says which cells lie within 15 nm of a Rayleigh line, below the
// first or above the second.
func rayleighMask(g eem.Grid) []eem.Reason {
	const half = 15 // nm
	why := make([]eem.Reason, g.Cells())
	for j := range g.Ex.Len() {
		for k := range g.Em.Len() {
			ex, em := g.Ex.At(j), g.Em.At(k)
			switch {
			case em < ex-half:
				why[g.Index(j, k)] = eem.BelowExcitation
			case em <= ex+half:
				why[g.Index(j, k)] = eem.Rayleigh1
			case em >= 2*ex-half:
				why[g.Index(j, k)] = eem.Rayleigh2
			}
		}
	}
	return why
}

// clip marks as saturated the present cells above 70 % of the brightest
// present one, as a detector at its limit would.
func clip(x []float64, why []eem.Reason) {
	top := 0.0
	for i, v := range x {
		if why[i] == eem.Measured {
			top = max(top, v)
		}
	}
	for i, v := range x {
		if why[i] == eem.Measured && v > 0.7*top {
			why[i] = eem.Saturated
		}
	}
}

// pick marks n of m at random.
func pick(rnd *rand.Rand, m, n int) []bool {
	out := make([]bool, m)
	for _, i := range rnd.Perm(m)[:n] {
		out[i] = true
	}
	return out
}

// steps is eem.Steps for axes that are known to be right.
func steps(from, to, step float64) eem.Axis {
	a, err := eem.Steps(from, to, step)
	if err != nil {
		panic(err)
	}
	return a
}
