package correct

import (
	"errors"
	"fmt"
	"math"

	"tarnlight/eem"
)

// Mean averages blanks cell by cell. They must share one grid and one unit
// (regrid them first). Of a cell that some blanks lack the mean is over the
// others, but a cell that is saturated in one is missing: leaving out values for
// being large would bias the mean. The variance of the mean comes from the
// blanks' own variances where all have them, else from their scatter when there
// are two or more. Causes common to all are averaged as one error.
func Mean(blanks []*eem.EEM) (*eem.EEM, error) {
	if len(blanks) == 0 {
		return nil, errors.New("no blank to average")
	}
	known := true
	for _, b := range blanks {
		if !b.Grid.Equal(blanks[0].Grid) {
			return nil, fmt.Errorf("blanks are on different grids (%s and %s); bring them to one grid first", blanks[0].Grid, b.Grid)
		}
		if b.Unit != blanks[0].Unit {
			return nil, fmt.Errorf("blanks are in %s and in %s", blanks[0].Unit, b.Unit)
		}
		known = known && b.Var != nil
	}
	out := eem.New(blanks[0].Grid, blanks[0].Unit)
	if known || len(blanks) > 1 {
		out.Var = make([]float64, len(out.F))
	}
	for i := range out.F {
		meanCell(out, blanks, i, known)
	}
	out.Causes = meanCauses(blanks)
	out.Note(record(StepBlank, "mean of the blanks", eem.Param{Name: "blanks", Value: fmt.Sprint(len(blanks)), Source: "run sheet"}))
	return out, nil
}

// meanCell sets cell i of out.
func meanCell(out *eem.EEM, blanks []*eem.EEM, i int, known bool) {
	n, sum, variance, why := 0.0, 0.0, 0.0, eem.NotMeasured
	for _, b := range blanks {
		switch {
		case b.Why[i] == eem.Saturated:
			out.Drop(i, eem.Saturated)
			return
		case math.IsNaN(b.F[i]):
			why = max(why, b.Why[i])
			continue
		}
		n++
		sum += b.F[i]
		if known {
			variance += b.Var[i]
		}
	}
	switch {
	case n == 0:
		out.Drop(i, why)
		return
	case math.IsInf(sum, 0):
		out.Drop(i, eem.Saturated)
		return
	}
	out.F[i], out.Why[i] = sum/n, eem.Measured
	if out.Var == nil {
		return
	}
	if known {
		out.Var[i] = variance / (n * n)
		return
	}
	ss := 0.0
	for _, b := range blanks {
		if d := b.F[i] - sum/n; !math.IsNaN(d) {
			ss += d * d
		}
	}
	out.Var[i] = ss / (n - 1) / n // NaN for one value: its scatter is not known
}

// meanCauses averages the shapes of equal causes over the blanks; a blank that
// lacks a cause adds nothing to it.
func meanCauses(blanks []*eem.EEM) []eem.Cause {
	var out []eem.Cause
	for _, b := range blanks {
		b = own(b)
		fix(b)
		for _, c := range b.Causes {
			at := findCause(out, c)
			if at < 0 {
				at = len(out)
				out = append(out, eem.Cause{Name: c.Name, Scope: c.Scope, Key: c.Key, U: c.U, Shape: make([]float64, len(c.Shape))})
			}
			for i, s := range c.Shape {
				out[at].Shape[i] += s / float64(len(blanks))
			}
		}
	}
	return out
}

// findCause returns the place of the cause that is the same unknown as c, or −1.
func findCause(in []eem.Cause, c eem.Cause) int {
	for i, d := range in {
		if d.Name == c.Name && d.Scope == c.Scope && d.Key == c.Key {
			return i
		}
	}
	return -1
}

// Blank subtracts the blank, regridded to e. Cells that the blank lacks become
// missing (NoBlank) and are flagged, but for those where the blank itself was
// saturated or cut as scatter. Variances add; a cause that both share acts on
// the difference (a factor that is 1 % high makes sample minus blank 1 % high),
// one of the blank alone acts with the opposite sign. It panics when the units
// differ.
func Blank(e, blank *eem.EEM) *eem.EEM {
	if e.Unit != blank.Unit {
		panic(fmt.Sprintf("correct: a blank in %s cannot be subtracted from %s", blank.Unit, e.Unit))
	}
	b := blank.Regrid(e.Grid)
	b.Causes = regridCauses(blank, e.Grid)
	out := own(e)
	fix(out)
	lost := 0
	for i := range out.F {
		if !math.IsNaN(b.F[i]) {
			out.F[i] -= b.F[i]
			dropInf(out, i)
			if out.Var != nil && b.Var != nil && !math.IsNaN(b.Var[i]) {
				out.Var[i] += b.Var[i]
			}
			continue
		}
		if measured(e, i) {
			out.Drop(i, eem.NoBlank)
			if b.Why[i] != eem.Saturated && !b.Why[i].Scatter() {
				lost++
			}
		}
	}
	subtractCauses(out, b)
	out.Note(record(StepBlank, "blank subtracted"))
	if lost > 0 {
		out.Note(finding(StepBlank, "blank-range", float64(lost), 0, fmt.Sprintf(
			"the blank (%s) does not cover %s of %s, left out: scan the blank over the same wavelengths", blank.Grid, eem.Count(lost, "cell"), e.Grid)))
	}
	return out
}

// regridCauses gives the causes of b with shapes on grid g.
func regridCauses(b *eem.EEM, g eem.Grid) []eem.Cause {
	c := own(b)
	fix(c)
	if b.Grid.Equal(g) {
		return c.Causes
	}
	for n := range c.Causes {
		c.Causes[n].Shape = eem.FromCells(b.Grid, b.Unit, c.Causes[n].Shape).Regrid(g).F
	}
	return c.Causes
}

// subtractCauses takes the blank's causes off those of e.
func subtractCauses(e, b *eem.EEM) {
	for _, c := range b.Causes {
		at := findCause(e.Causes, c)
		if at < 0 {
			at = len(e.Causes)
			e.Causes = append(e.Causes, eem.Cause{Name: c.Name, Scope: c.Scope, Key: c.Key, U: c.U, Shape: make([]float64, len(e.F))})
		}
		for i, s := range c.Shape {
			e.Causes[at].Shape[i] -= s
		}
	}
}
