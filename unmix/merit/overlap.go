package merit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"tarnlight/unmix"
)

// Overlap says how well one column of a mixing model stands out of the others.
type Overlap struct {
	Sensitivity float64 // length of what is its own (net analyte signal), per unit of amount
	Selectivity float64 // share of its length that is its own: 1 stands alone, 0 is a mixture of the others
	VIF         float64 // variance inflation 1/Selectivity²: by what overlap multiplies a variance
}

// Overlaps judges the columns of a (cells × n) by the net analyte signal, the part
// of a column that is orthogonal to the others: SEN = 1/√[(A'A)⁻¹]_nn, SEL = SEN/‖a‖
// (Lorber 1986; Olivieri et al. 2006, Pure Appl. Chem. 78, 633; formulas from
// memory). Dependent columns have selectivity 0 and infinite VIF.
func Overlaps(a mat.Matrix) []Overlap {
	_, n := a.Dims()
	var g mat.Dense
	g.Mul(a.T(), a)
	gram := make([]float64, n*n)
	for i := range n {
		copy(gram[i*n:(i+1)*n], g.RawRowView(i))
	}
	return overlaps(gram, n)
}

func overlaps(gram []float64, n int) []Overlap {
	inv := inverse(gram, n, all(n))
	out := make([]Overlap, n)
	for f := range out {
		if inv == nil {
			out[f] = Overlap{0, 0, math.Inf(1)}
			continue
		}
		out[f].Sensitivity = 1 / math.Sqrt(inv[f*n+f])
		out[f].Selectivity = out[f].Sensitivity / math.Sqrt(gram[f*n+f])
		out[f].VIF = inv[f*n+f] * gram[f*n+f]
	}
	return out
}

// SecondOrder is the sensitivity of maps, per unit of the signal of a pure
// component, 1 where it stands alone.
type SecondOrder struct {
	All     float64 // with every component known: {[(B'B)∗(C'C)]⁻¹}_nn^−½
	Unknown float64 // where interferents that nobody knows may be there too: {[(B'B)⁻¹]_nn [(C'C)⁻¹]_nn}^−½
}

// SecondOrders judges components by their spectra in both modes, F × J and F × K
// (Messick, Kalivas & Lang 1996; Ho, Christian & Davidson 1980; formulas from
// memory). Spectra are brought to unit length.
func SecondOrders(ex, em [][]float64) []SecondOrder {
	n := len(ex)
	b, c := cosines(ex), cosines(em)
	both := make([]float64, n*n)
	for i := range both {
		both[i] = b[i] * c[i]
	}
	ib, ic, ia := inverse(b, n, all(n)), inverse(c, n, all(n)), inverse(both, n, all(n))
	out := make([]SecondOrder, n)
	for f := range out {
		if ia != nil {
			out[f].All = 1 / math.Sqrt(ia[f*n+f])
		}
		if ib != nil && ic != nil {
			out[f].Unknown = 1 / math.Sqrt(ib[f*n+f]*ic[f*n+f])
		}
	}
	return out
}

// cosines are the products of the vectors at unit length, n × n; entries that
// either lacks (NaN) are left out.
func cosines(v [][]float64) []float64 {
	n := len(v)
	out := make([]float64, n*n)
	for f := range v {
		for h := range v {
			var fh, ff, hh float64
			for i, x := range v[f] {
				if y := v[h][i]; x == x && y == y {
					fh, ff, hh = fh+x*y, ff+x*x, hh+y*y
				}
			}
			out[f*n+h] = fh / math.Sqrt(ff*hh)
		}
	}
	return out
}

// maxVIF is the variance inflation beyond which two components are not reported
// apart (Belsley, Kuh & Welsch 1980; from memory).
const maxVIF = 10

// AlikeIn lists the pairs that cannot be told apart among the columns of K whose Gram
// matrix KᵀK, n × n, is given.
func AlikeIn(gram []float64, n int) []Alike { return alike(gram, n, maxVIF) }

// Alike is a pair of components that cells cannot tell apart.
type Alike struct {
	F, H        int
	Correlation float64 // of their estimates
}

// Pairs lists the components of a set that cannot be told apart and whose amounts
// have one unit: estimates correlated as those of two with a variance inflation
// above 10. Only their sum is sure.
func Pairs(set *unmix.Set) []Alike {
	a, cells := set.Matrix()
	n := set.Len()
	gram := make([]float64, n*n)
	for l := range cells {
		addOuter(gram, a[l*n:(l+1)*n], 1)
	}
	return slices.DeleteFunc(alike(gram, n, maxVIF), func(p Alike) bool {
		return set.Components[p.F].AmountUnit != set.Components[p.H].AmountUnit
	})
}

// alike lists pairs whose estimates are correlated as those of two components with
// a variance inflation above vif: ρ < −√(1 − 1/VIF).
func alike(gram []float64, n int, vif float64) []Alike {
	inv := inverse(gram, n, all(n))
	var out []Alike
	for f := range n {
		for h := f + 1; h < n; h++ {
			rho := -1.0
			if inv != nil {
				rho = inv[f*n+h] / math.Sqrt(inv[f*n+f]*inv[h*n+h])
			} else if c := gram[f*n+h] / math.Sqrt(gram[f*n+f]*gram[h*n+h]); c < 1-1e-7 {
				continue
			}
			if rho < -math.Sqrt(1-1/vif) {
				out = append(out, Alike{f, h, rho})
			}
		}
	}
	return out
}
