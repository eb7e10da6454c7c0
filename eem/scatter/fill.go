package scatter

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"tarnlight/eem"
)

// Ways to treat the cells of the bands.
const (
	Missing     = "missing"
	Interpolate = "interpolate"
	Zero        = "zero"
)

// Fill gives the cells that scatter bands took a number: none (Missing), by
// monotone interpolation along emission between the measured cells on both sides
// (Interpolate), or 0 (Zero). Interpolation never goes past the measured cells
// at either end and leaves gaps that hold cells missing for another reason. A
// filled cell keeps its Reason, so that it is known as filled, and has no
// variance (NaN): in a fit it weighs nothing. It panics on another word.
func Fill(e *eem.EEM, how string) *eem.EEM {
	out := e.Clone()
	n := 0
	switch how {
	case Missing, "":
		how = Missing
	case Zero:
		for i, w := range out.Why {
			if w.Scatter() {
				out.F[i] = 0
				n++
			}
		}
	case Interpolate:
		for j := range e.Ex.Len() {
			n += fillScan(out, j)
		}
	default:
		panic(fmt.Sprintf("scatter: cannot fill by %q", how))
	}
	out.Note(eem.Note{Step: Step, Msg: eem.Count(n, "cell") + " of the scatter bands filled", Params: []eem.Param{
		{Name: "fill", Value: how, Source: "settings: scatter.fill"},
		{Name: "cells filled", Value: fmt.Sprint(n), Unit: "cells", Source: "grid"}}})
	return out
}

// fillScan interpolates the gaps of one emission scan and counts the cells.
func fillScan(e *eem.EEM, j int) int {
	row, why := e.Row(j), e.Why[j*e.Em.Len():]
	n := 0
	for k := 0; k < len(row); k++ {
		if known(row, why, k) {
			continue
		}
		from := k
		scatterOnly := true
		for ; k < len(row) && !known(row, why, k); k++ {
			scatterOnly = scatterOnly && why[k].Scatter()
		}
		if from == 0 || k == len(row) || !scatterOnly {
			continue
		}
		n += k - from
		bridge(e.Em, row, why, from, k)
	}
	return n
}

// known says whether cell k holds a measured number.
func known(row []float64, why []eem.Reason, k int) bool {
	return why[k] == eem.Measured && !math.IsNaN(row[k])
}

// bridge fills cells from … to−1 by the piecewise cubic of Fritsch & Butland 1984
// (SIAM J. Sci. Stat. Comput. 5, 300) through the measured cells. Between two
// nodes it depends on those and on one more at each side, so that four suffice.
func bridge(em eem.Axis, row []float64, why []eem.Reason, from, to int) {
	x, y := make([]float64, 0, 4), make([]float64, 0, 4)
	add := func(k int) { x, y = append(x, em.At(k)), append(y, row[k]) }
	for k := from - 2; k >= 0; k-- {
		if known(row, why, k) {
			add(k)
			break
		}
	}
	add(from - 1)
	add(to)
	for k := to + 1; k < len(row); k++ {
		if known(row, why, k) {
			add(k)
			break
		}
	}
	var fb interp.FritschButland
	_ = fb.Fit(x, y) // always nil; the nodes are finite and increase
	for k := from; k < to; k++ {
		if v := fb.Predict(em.At(k)); !math.IsNaN(v) && !math.IsInf(v, 0) { // values near 1e308 overflow
			row[k] = v
		}
	}
}
