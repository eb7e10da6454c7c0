package merit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// z975 is the 97.5 % point of the standard normal distribution.
const z975 = 1.9599639845400545

// combine adds up the sources and draws the conclusions.
func (b *bottle) combine() {
	n := b.e.n
	mats := make([][]float64, len(b.sources))
	total := make([]float64, n*n)
	for t := range b.sources {
		mats[t] = make([]float64, n*n)
		b.sources[t].at(mats[t], b.x)
		axpy(1, mats[t], total)
		b.sources[t].U = nans(n)
	}
	passive := passiveSet(b.x, -1)
	wp := inverse(b.m.gram, n, passive)
	b.out.Cov = sandwich(wp, total, n)
	v, df := make([]float64, len(mats)), make([]float64, len(mats))
	for t := range mats {
		df[t] = b.sources[t].DF
	}
	for f := range n {
		row := b.sensitivity(f, wp)
		if row == nil {
			continue // the data say nothing about it
		}
		sum := 0.0
		for t := range mats {
			v[t] = math.Max(0, form(mats[t], row))
			b.sources[t].U[f] = math.Sqrt(v[t])
			sum += v[t]
		}
		b.out.U[f], b.out.DF[f] = math.Sqrt(sum), effective(v, df)
		b.out.Critical[f], b.out.Detection[f], b.out.Quantifiable[f] = b.limits([]int{f}, row, df)
		b.ownLimits(f)
		k := TQuantile(0.975, b.out.DF[f])
		b.out.Lower[f], b.out.Upper[f] = math.Max(0, b.x[f]-k*b.out.U[f]), b.x[f]+k*b.out.U[f]
	}
	b.sums(mats, wp, df)
	b.monteCarlo(total)
	b.budget()
}

// sums judges the pairs that cannot be told apart.
func (b *bottle) sums(mats [][]float64, wp, df []float64) {
	n := b.e.n
	v := make([]float64, len(mats))
	for _, p := range b.e.pairs {
		w := wp
		if b.x[p.F] <= 0 && b.x[p.H] <= 0 {
			w = inverse(b.m.gram, n, passiveSet(b.x, p.F))
		}
		nan := math.NaN()
		s := Sum{p, b.x[p.F] + b.x[p.H], nan, nan, nan, nan, nan, nan}
		if w != nil {
			row := slices.Clone(w[p.F*n : (p.F+1)*n])
			axpy(1, w[p.H*n:(p.H+1)*n], row)
			sum := 0.0
			for t := range mats {
				v[t] = math.Max(0, form(mats[t], row))
				sum += v[t]
			}
			s.U = math.Sqrt(sum)
			k := TQuantile(0.975, effective(v, df))
			s.Lower, s.Upper = math.Max(0, s.Value-k*s.U), s.Value+k*s.U
			s.Critical, s.Detection, s.Quantifiable = b.limits([]int{p.F, p.H}, row, df)
		}
		b.out.Sums = append(b.out.Sums, s)
	}
}

// sensitivity is row f of W for component f free beside those above zero; nil where
// it depends on them.
func (b *bottle) sensitivity(f int, wp []float64) []float64 {
	n := b.e.n
	w := wp
	if b.x[f] <= 0 {
		w = inverse(b.m.gram, n, passiveSet(b.x, f))
	}
	if w == nil || w[f*n+f] == 0 {
		return nil
	}
	return w[f*n : (f+1)*n]
}

// effective sums variances of equal degrees of freedom before the formula of
// Satterthwaite: they rest on the same few repetitions and are off together.
func effective(v, df []float64) float64 {
	var sum, of []float64
	for t, d := range df {
		at := slices.Index(of, d)
		if at < 0 {
			at = len(of)
			of, sum = append(of, d), append(sum, 0)
		}
		sum[at] += v[t]
	}
	return Satterthwaite(sum, of)
}

// limits returns critical value, detection and quantification limit of a component
// (or the sum of several) from what would be left of the uncertainty if the bottle
// held none of it, u0, and what grows with the amount, r·x:
//
//	critical  t·u0 + max(0, b)              5 % of bottles without it exceed it
//	detection (δ·u0 + |b|)/(1 − k²r²)       95 % of bottles with it exceed that
//	quantification √(u0² + b²)/√(0.1² − r²) relative standard uncertainty 10 %
//
// with t Student's 95 % point, δ the non-centrality of ISO 11843-2, k = 1.645 and b the
// bias that the bottle's other components bring (see bounds). One that would hide the
// component does not lower the critical value: it is itself estimated from the data.
func (b *bottle) limits(of []int, row, df []float64) (critical, detection, quantifiable float64) {
	n := b.e.n
	none, one := slices.Clone(b.x), make([]float64, n)
	for _, f := range of {
		none[f], one[f] = 0, 1/float64(len(of))
	}
	if b.nothing == nil {
		b.nothing = b.atNothing()
	}
	v := make([]float64, len(b.sources))
	m := make([]float64, n*n)
	u0, r2, bias := 0.0, 0.0, 0.0
	for t := range b.sources {
		if b.sources[t].Cause == misfit {
			continue // what is not in the model makes the decision doubtful, not lenient
		}
		clear(m)
		b.sources[t].at(m, none)
		if b.sources[t].bias {
			bias += b.sources[t].biasOf(row, none)
		} else {
			v[t] = math.Max(0, form(m, row))
			u0 += v[t]
		}
		clear(m)
		b.sources[t].at(m, one)
		at1 := math.Max(0, form(m, row))
		r2 += math.Max(0, at1-math.Max(0, form(b.nothing[t], row)))
	}
	nu := effective(v, df)
	u0 = math.Sqrt(u0)
	critical, detection, quantifiable = TQuantile(0.95, nu)*u0+math.Max(0, bias), math.NaN(), math.NaN()
	if shrink := 1 - kCritical*kCritical*r2; shrink > 0 {
		detection = (Delta(nu, 0.05, 0.05)*u0 + math.Abs(bias)) / shrink
	}
	if r2 < 0.01 {
		quantifiable = math.Hypot(u0, bias) / math.Sqrt(0.01-r2)
	}
	return critical, detection, quantifiable
}

// atNothing is what every source does to a bottle that holds nothing.
func (b *bottle) atNothing() [][]float64 {
	n := b.e.n
	out, none := make([][]float64, len(b.sources)), make([]float64, n)
	for t := range out {
		out[t] = make([]float64, n*n)
		b.sources[t].at(out[t], none)
	}
	return out
}

// ownLimits puts the laboratory's limits in the place of the computed ones.
func (b *bottle) ownLimits(f int) {
	l, ok := b.e.src.Limits[b.e.r.Set.Components[f].Name]
	if !ok {
		return
	}
	if b.out.Computed == nil {
		b.out.Computed = make([]Limits, b.e.n)
	}
	b.out.Computed[f] = Limits{b.out.Critical[f], b.out.Detection[f], b.out.Quantifiable[f]}
	for _, v := range []struct {
		to  *float64
		own float64
	}{{&b.out.Critical[f], l.Critical}, {&b.out.Detection[f], l.Detection}, {&b.out.Quantifiable[f], l.Quantification}} {
		if v.own == v.own {
			*v.to = v.own
		}
	}
}

// passiveSet lists the components above zero, and with.
func passiveSet(x []float64, with int) []int {
	var out []int
	for f, v := range x {
		if v > 0 || f == with {
			out = append(out, f)
		}
	}
	return out
}

func all(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}

// inverse returns the inverse of the rows and columns idx of the n × n matrix g,
// 0 elsewhere; nil where it is singular (condition number of the unit-norm columns
// above 1e7).
func inverse(g []float64, n int, idx []int) []float64 {
	out := make([]float64, n*n)
	k := len(idx)
	if k == 0 {
		return out
	}
	s := mat.NewSymDense(k, nil)
	for a, x := range idx {
		for c, y := range idx[:a+1] {
			s.SetSym(a, c, g[x*n+y]/math.Sqrt(g[x*n+x]*g[y*n+y]))
		}
	}
	var chol mat.Cholesky
	if !finite(s) || !chol.Factorize(s) || chol.Cond() > 1e14 {
		return nil
	}
	var inv mat.SymDense
	if chol.InverseTo(&inv) != nil {
		return nil
	}
	for a, x := range idx {
		for c, y := range idx {
			out[x*n+y] = inv.At(a, c) / math.Sqrt(g[x*n+x]*g[y*n+y])
		}
	}
	return out
}

func finite(s *mat.SymDense) bool {
	n := s.SymmetricDim()
	for i := range n {
		for j := range n {
			if v := s.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
				return false
			}
		}
	}
	return true
}

// sandwich is w m w'.
func sandwich(w, m []float64, n int) []float64 {
	if w == nil {
		return nans(n * n)
	}
	a, b := mat.NewDense(n, n, slices.Clone(w)), mat.NewDense(n, n, slices.Clone(m))
	var t, out mat.Dense
	t.Mul(a, b)
	out.Mul(&t, a.T())
	return out.RawMatrix().Data
}

// budget lists the terms, largest first by their largest share of any component.
func (b *bottle) budget() {
	share := func(t Term) float64 {
		s := 0.0
		for f, u := range t.U {
			if b.out.U[f] > 0 && u == u {
				s = math.Max(s, u/b.out.U[f])
			}
		}
		return s
	}
	for _, s := range b.sources {
		b.out.Terms = append(b.out.Terms, s.Term)
	}
	slices.SortStableFunc(b.out.Terms, func(x, y Term) int {
		switch a, c := share(x), share(y); {
		case a > c:
			return -1
		case a < c:
			return 1
		}
		return 0
	})
	for i, t := range b.silent { // one row a name
		if !slices.ContainsFunc(b.silent[:i], func(o Term) bool { return o.Cause == t.Cause }) {
			b.out.Terms = append(b.out.Terms, t)
		}
	}
}
