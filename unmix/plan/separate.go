package plan

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"tarnlight/unmix/merit"
)

// Mixed are components that a choice of scans does not tell apart: a pair whose
// estimates are correlated as those of two with a variance inflation above 10 (what
// is then reported is their sum), more of them where one is a mixture of the others,
// or a single one that gives no light there.
type Mixed struct {
	Components  []int
	Correlation float64 // of a pair's estimates, −1 for no information; NaN else
	// Line is the excitation, by its index, whose scan beside the others would do
	// most, −1 where none does anything; Parted says whether that is enough.
	Line   int
	Parted bool
	After  float64 // correlation with that scan
}

// Mixed lists what scans at these excitations do not tell apart, and which scan would.
func (d *Design) Mixed(lines []int) []Mixed {
	w := d.worker()
	w.set(lines)
	gram := slices.Clone(w.gram)
	var out []Mixed
	for _, group := range d.mixedIn(gram) {
		m := Mixed{Components: group, Correlation: correlation(gram, d.n, group), Line: -1}
		m.After = math.Inf(-1)
		for _, j := range d.use {
			if slices.Contains(lines, j) {
				continue
			}
			next := slices.Clone(gram)
			floats.Add(next, d.lines[j].gram)
			if v := d.apart(next, group); v > m.After && v > d.apart(gram, group) {
				m.After, m.Line = v, j
			}
		}
		if m.Line >= 0 {
			next := slices.Clone(gram)
			floats.Add(next, d.lines[m.Line].gram)
			m.Parted = !slices.ContainsFunc(d.mixedIn(next), func(g []int) bool { return slices.Equal(g, group) })
			m.After = correlation(next, d.n, group)
		}
		out = append(out, m)
	}
	return out
}

// unseen is the share of a component's signal on the whole grid below which scans do
// not see it.
const unseen = 1e-12

// mixedIn lists the groups of a Gram matrix.
func (d *Design) mixedIn(gram []float64) [][]int {
	var out [][]int
	var seen []int
	w := d.worker()
	w.set(d.use)
	for f := range d.n {
		if gram[f*d.n+f] <= unseen*w.gram[f*d.n+f] {
			out = append(out, []int{f})
		} else {
			seen = append(seen, f)
		}
	}
	part := submatrix(gram, d.n, seen)
	for _, p := range merit.AlikeIn(part, len(seen)) {
		out = append(out, []int{seen[p.F], seen[p.H]})
	}
	if len(out) == 0 {
		if group := dependent(part, seen); group != nil {
			out = append(out, group)
		}
	}
	return out
}

func submatrix(m []float64, n int, idx []int) []float64 {
	out := make([]float64, 0, len(idx)*len(idx))
	for _, f := range idx {
		for _, h := range idx {
			out = append(out, m[f*n+h])
		}
	}
	return out
}

// dependent names the components of which one is a mixture of the others; nil where
// none is. They are those in the vector that the matrix maps to nothing.
func dependent(gram []float64, names []int) []int {
	values, vectors := unitEigen(gram, len(names))
	if values == nil || values[0] > least {
		return nil
	}
	var out []int
	for i, f := range names {
		if math.Abs(vectors.At(i, 0)) > 0.1 {
			out = append(out, f)
		}
	}
	return out
}

// unitEigen is the decomposition of a Gram matrix whose columns have unit norm,
// smallest value first.
func unitEigen(gram []float64, n int) ([]float64, *mat.Dense) {
	if n == 0 {
		return nil, nil
	}
	s := mat.NewSymDense(n, nil)
	for f := range n {
		for h := range f + 1 {
			s.SetSym(f, h, gram[f*n+h]/math.Sqrt(gram[f*n+f]*gram[h*n+h]))
		}
	}
	var e mat.EigenSym
	if !e.Factorize(s, true) {
		return nil, nil
	}
	var v mat.Dense
	e.VectorsTo(&v)
	return e.Values(nil), &v
}

// apart is how well a group is told apart, larger is better: a component's own
// signal, a pair's correlation, a group's smallest eigenvalue.
func (d *Design) apart(gram []float64, group []int) float64 {
	switch len(group) {
	case 1:
		return gram[group[0]*d.n+group[0]]
	case 2:
		return correlation(gram, d.n, group)
	}
	values, _ := unitEigen(submatrix(gram, d.n, group), len(group))
	if values == nil {
		return 0
	}
	return values[0]
}

// correlation of the estimates of a pair beside all other components that give
// light; of the pair alone where those are dependent. NaN for other groups.
func correlation(gram []float64, n int, group []int) float64 {
	if len(group) != 2 {
		return math.NaN()
	}
	f, h := group[0], group[1]
	var idx []int
	for g := range n {
		if gram[g*n+g] > 0 {
			idx = append(idx, g)
		}
	}
	k := len(idx)
	s := mat.NewSymDense(k, nil)
	for a, x := range idx {
		for b, y := range idx[:a+1] {
			s.SetSym(a, b, gram[x*n+y]/math.Sqrt(gram[x*n+x]*gram[y*n+y]))
		}
	}
	var chol mat.Cholesky
	var inv mat.SymDense
	if !chol.Factorize(s) || chol.Cond() > 1e12 || chol.InverseTo(&inv) != nil {
		if !(gram[f*n+f] > 0 && gram[h*n+h] > 0) {
			return -1
		}
		return -gram[f*n+h] / math.Sqrt(gram[f*n+f]*gram[h*n+h])
	}
	a, b := slices.Index(idx, f), slices.Index(idx, h)
	return inv.At(a, b) / math.Sqrt(inv.At(a, a)*inv.At(b, b))
}
