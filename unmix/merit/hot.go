package merit

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// Hot is where a residual map stands out most of its noise.
type Hot struct {
	Ex, Em         float64 // nm
	Height, Z      float64 // intensity, and over the noise of that cell; NaN unknown
	ExSpan, EmSpan float64 // nm: how far it stays above half its height
	Cells, Above   int     // cells of the map, and those above 4 standard deviations
	ChanceAbove    float64 // how many of them noise alone would put there
}

// HottestSpot finds the cell of a residual map (J × K, NaN missing) with the largest
// residual over its noise u, or the largest residual where u is nil.
func HottestSpot(g eem.Grid, residual []float64, u []float32) Hot {
	h := Hot{Z: math.NaN(), Height: math.NaN()}
	best, at := math.Inf(-1), -1
	for i, r := range residual {
		if r != r {
			continue
		}
		h.Cells++
		z := r
		if u != nil {
			z = r / float64(u[i])
			if z > 4 {
				h.Above++
			}
		}
		if z > best {
			best, at = z, i
		}
	}
	const beyond4 = 3.167124183311986e-5 // of a normal distribution
	h.ChanceAbove = beyond4 * float64(h.Cells)
	if at < 0 {
		return h
	}
	nk := g.Em.Len()
	j, k := at/nk, at%nk
	h.Ex, h.Em, h.Height = g.Ex.At(j), g.Em.At(k), residual[at]
	if u != nil {
		h.Z = best
	}
	h.ExSpan = span(g.Ex, j, func(x int) float64 { return residual[g.Index(x, k)] })
	h.EmSpan = span(g.Em, k, func(x int) float64 { return residual[g.Index(j, x)] })
	return h
}

// span is how far a line through the maximum at stays above half of it, nm. Missing
// cells are passed over.
func span(a eem.Axis, at int, v func(int) float64) float64 {
	half := v(at) / 2
	lo, hi := at, at
	for i := at - 1; i >= 0 && !(v(i) < half); i-- {
		if v(i) == v(i) {
			lo = i
		}
	}
	for i := at + 1; i < a.Len() && !(v(i) < half); i++ {
		if v(i) == v(i) {
			hi = i
		}
	}
	return a.At(hi) - a.At(lo)
}

// String tells the spot in words.
func (h Hot) String() string {
	s := fmt.Sprintf("largest at ex %s / em %s nm", eem.NM(h.Ex), eem.NM(h.Em))
	switch {
	case h.ExSpan > 0 || h.EmSpan > 0:
		s += fmt.Sprintf(", above half of it over %s × %s nm", eem.NM(h.ExSpan), eem.NM(h.EmSpan))
	default:
		s += ", in a single cell"
	}
	if h.Z == h.Z {
		s += fmt.Sprintf(", %s standard deviations of the noise; %d cells are above 4, by chance %.2g would be", digits(h.Z, 3), h.Above, h.ChanceAbove)
	}
	return s
}
