package optics

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// value is a number computed from an EEM together with its derivative by the
// cells, so that the EEM's uncertainties carry over and errors that cancel in a
// ratio do cancel.
type value struct {
	v       float64
	by      []term
	refused string
}

type term struct {
	cell int
	d    float64
}

// quantity is something to compute from an EEM.
type quantity func(e *eem.EEM) value

// at interpolates linearly at (ex, em) along both axes. ok is false where the
// grid or a needed cell lacks a number; filled says that a needed cell was not
// measured.
func at(e *eem.EEM, ex, em float64) (v value, filled, ok bool) {
	j, wj, ok1 := e.Ex.Bracket(ex)
	k, wk, ok2 := e.Em.Bracket(em)
	if !ok1 || !ok2 {
		return v, false, false
	}
	for _, c := range [4]struct {
		dj, dk int
		w      float64
	}{{0, 0, (1 - wj) * (1 - wk)}, {0, 1, (1 - wj) * wk}, {1, 0, wj * (1 - wk)}, {1, 1, wj * wk}} {
		if c.w == 0 {
			continue
		}
		i := e.Index(j+c.dj, k+c.dk)
		v.v += c.w * e.F[i]
		v.by = append(v.by, term{i, c.w})
		filled = filled || e.Why[i] != eem.Measured
	}
	return v, filled, !math.IsNaN(v.v)
}

// point is the intensity at one place.
func point(ex, em float64) quantity {
	return func(e *eem.EEM) value { return gather(e, ex, ex, em, em, add) }
}

// window is the sum over em from … to in steps of 1 nm at ex. (The integral by
// trapezoids is less by half the end values; published values use both, and
// the data that this package is held against use the sum.)
func window(ex, from, to float64) quantity {
	return func(e *eem.EEM) value { return gather(e, ex, ex, from, to, add) }
}

// highest is the largest intensity on a grid of 1 nm in the box.
func highest(exFrom, exTo, emFrom, emTo float64) quantity {
	return func(e *eem.EEM) value { return gather(e, exFrom, exTo, emFrom, emTo, larger) }
}

func add(a, b value) value { return value{v: a.v + b.v, by: append(a.by, b.by...)} }

func larger(a, b value) value {
	if b.v > a.v || a.by == nil {
		return b
	}
	return a
}

// gather visits the box in steps of 1 nm and joins what it finds.
func gather(e *eem.EEM, exFrom, exTo, emFrom, emTo float64, join func(a, b value) value) value {
	var out value
	n, filled := 0, 0
	for ex := exFrom; ex <= exTo; ex++ {
		for em := emFrom; em <= emTo; em++ {
			v, f, ok := at(e, ex, em)
			if !ok {
				return value{refused: fmt.Sprintf("the EEM has no value at ex %g, em %g nm", ex, em)}
			}
			n++
			if f {
				filled++
			}
			out = join(out, v)
		}
	}
	if float64(filled) > MaxFilled*float64(n) {
		out.refused = fmt.Sprintf("%.0f %% of the window ex %g–%g, em %g–%g nm was filled, not measured", 100*float64(filled)/float64(n), exFrom, exTo, emFrom, emTo)
	}
	return out
}

// ratio is num/den, refused where den is not positive.
func ratio(num, den quantity) quantity {
	return func(e *eem.EEM) value { return over(num(e), den(e)) }
}

// part is a/(a+b).
func part(a, b quantity) quantity {
	return func(e *eem.EEM) value {
		x, y := a(e), b(e)
		if x.refused != "" {
			return x
		}
		if y.refused != "" {
			return y
		}
		return over(x, add(value{v: x.v, by: x.by[:len(x.by):len(x.by)]}, y))
	}
}

func over(n, d value) value {
	switch {
	case n.refused != "":
		return n
	case d.refused != "":
		return d
	case !(d.v > 0):
		return value{refused: fmt.Sprintf("its denominator is %.3g, not positive", d.v)}
	}
	r := value{v: n.v / d.v}
	for _, t := range n.by {
		r.by = append(r.by, term{t.cell, t.d / d.v})
	}
	for _, t := range d.by {
		r.by = append(r.by, term{t.cell, -t.d * r.v / d.v})
	}
	return r
}

// uncertainty is the standard uncertainty of v: independent errors of cells by
// Σ (∂v/∂F)²·Var, each shared cause by the square of its effect on all cells
// together; NaN where the EEM knows of neither.
func (v value) uncertainty(e *eem.EEM) float64 {
	if e.Var == nil && len(e.Causes) == 0 {
		return math.NaN()
	}
	d := map[int]float64{}
	var cells []int // in a fixed order, so that sums are the same every time
	for _, t := range v.by {
		if _, seen := d[t.cell]; !seen {
			cells = append(cells, t.cell)
		}
		d[t.cell] += t.d
	}
	sum := 0.0
	for _, c := range cells {
		if e.Var != nil && !math.IsNaN(e.Var[c]) {
			sum += d[c] * d[c] * e.Var[c]
		}
	}
	for _, cause := range e.Causes {
		effect := 0.0
		for _, c := range cells {
			if cause.Shape != nil {
				effect += d[c] * cause.Shape[c]
			} else {
				effect += d[c] * cause.U * e.F[c]
			}
		}
		sum += effect * effect
	}
	return math.Sqrt(sum)
}
