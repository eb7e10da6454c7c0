package merit

import (
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// SpectraErrors lists what is known of the errors of a resolution's components, for a
// bottle that will be resolved by them elsewhere, on the given cells (all without any,
// as where nothing but standards was measured): causes behind
// their standards, or the covariance of their loadings. Each becomes at most F² shifts
// (principal components of its covariance, on unit-norm components), of which those
// under a millionth of the largest are left out. It returns nil where nothing is
// known, or the components depend on one another.
func SpectraErrors(c *eem.Cube, r *unmix.Resolution, src *Sources, cells []int) []unmix.SpectraError {
	e := newEngine(c, r, src)
	m := &mask{}
	for l, cell := range e.cells {
		if _, ok := slices.BinarySearch(cells, cell); ok || len(cells) == 0 {
			m.use = append(m.use, int32(l))
		}
	}
	m.make(e)
	w := inverse(m.gram, e.n, all(e.n))
	if w == nil {
		return nil
	}
	// A bottle without noise or causes of its own has those of the components left.
	b := &bottle{worker: e.worker(), i: nobody, m: m, x: make([]float64, e.n)}
	b.blanks()
	b.references()
	own := len(b.sources)
	b.shared()
	var out []unmix.SpectraError
	for t, s := range b.sources {
		name := s.Cause
		if t >= own && !strings.HasSuffix(name, ofStandards) {
			name += ofStandards // the bottle's own cause of that name is another one
		}
		if shifts := e.shiftsOf(s, w, m.gram); shifts != nil {
			out = append(out, unmix.SpectraError{Cause: name, Scope: s.Scope, DF: s.DF, Source: s.Source, Shifts: shifts})
		}
	}
	for i, s := range b.silent {
		if !slices.ContainsFunc(b.silent[:i], func(o Term) bool { return o.Cause == s.Cause }) {
			out = append(out, unmix.SpectraError{Cause: s.Cause, Scope: s.Scope, Source: s.Source})
		}
	}
	return out
}

// nobody is the row of no bottle.
const nobody = -1

// ofStandards is how the causes behind the standards end that a bottle has too.
const ofStandards = " of the standards"

// shiftsOf returns the principal components of a source as it acts on the
// contributions, x = W·K'…
func (e *engine) shiftsOf(s source, w, gram []float64) [][]float64 {
	n := e.n
	if s.bias {
		return [][]float64{product(w, s.effects[0], n)} // with its sign
	}
	t := mat.NewDense(n*n, n*n, nil) // [h][g] × [h'][g'], of K'…
	for _, y := range s.effects {
		v := mat.NewVecDense(n*n, y)
		t.RankOne(t, 1, v, v)
	}
	if s.tensor != nil {
		for h := range n {
			for h2 := range h + 1 {
				for i, v := range s.tensor[(h*n+h2)*n*n : (h*n+h2+1)*n*n] {
					t.Set(h*n+i/n, h2*n+i%n, v)
					t.Set(h2*n+i%n, h*n+i/n, v)
				}
			}
		}
	}
	unit := func(h, g int) float64 { return math.Sqrt(gram[h*n+h] / gram[g*n+g]) }
	by := mat.NewDense(n*n, n*n, nil) // W for every g, on unit-norm components
	for h := range n {
		for h2 := range n {
			for g := range n {
				by.Set(h*n+g, h2*n+g, w[h*n+h2]*unit(h, g))
			}
		}
	}
	var half, full mat.Dense
	half.Mul(by, t)
	full.Mul(&half, by.T())
	cov := mat.NewSymDense(n*n, nil)
	for i := range n * n {
		for l := range i + 1 {
			cov.SetSym(i, l, full.At(i, l))
		}
	}
	return principal(cov, func(h, g int) float64 { return 1 / unit(h, g) }, n)
}

// product is the matrix product of two n × n.
func product(a, b []float64, n int) []float64 {
	var out mat.Dense
	out.Mul(mat.NewDense(n, n, a), mat.NewDense(n, n, b))
	return out.RawMatrix().Data
}

// principal returns the components of a covariance of n × n entries, largest first,
// each entry brought back to its unit.
func principal(cov *mat.SymDense, unit func(h, g int) float64, n int) [][]float64 {
	var eig mat.EigenSym
	if !finite(cov) || !eig.Factorize(cov, true) {
		return nil
	}
	values := eig.Values(nil)
	var vectors mat.Dense
	eig.VectorsTo(&vectors)
	var out [][]float64
	top := values[len(values)-1]
	for z := len(values) - 1; z >= 0 && values[z] > 1e-12*top; z-- {
		v, root := make([]float64, n*n), math.Sqrt(values[z])
		for i := range v {
			v[i] = root * vectors.At(i, z) * unit(i/n, i%n)
		}
		out = append(out, v)
	}
	return out
}

// frozen adds the errors that came with the components.
func (b *bottle) frozen() {
	for _, s := range b.e.r.Set.Errors {
		if s.Shifts == nil {
			b.silent = append(b.silent, Term{Cause: s.Cause, Scope: s.Scope, Source: s.Source})
			continue
		}
		if s.Cause == CauseBounds && len(s.Shifts) == 1 {
			b.addBias(s.Cause, s.Scope, s.Source, b.frozenBias(s.Shifts[0]))
			continue
		}
		b.add(s.Cause, s.Scope, s.DF, s.Source, b.shifted(s.Shifts))
	}
	if b.e.src.References == nil && b.m.load == nil && b.e.r.Set.Errors == nil {
		b.silent = append(b.silent, Term{Cause: "loadings", Scope: "survey", Source: "not given"})
	}
}

// shifted is the source of errors of the contributions that are linear in them. A
// component that was added to the set has none.
func (b *bottle) shifted(shifts [][]float64) func(dst, x []float64) {
	n := b.e.n
	known := 0
	for known*known < len(shifts[0]) {
		known++
	}
	return func(dst, x []float64) {
		v, y := make([]float64, known), make([]float64, n)
		for _, s := range shifts {
			for h := range v {
				v[h] = 0
				for g, a := range x[:known] {
					v[h] += s[h*known+g] * a
				}
			}
			for h := range y {
				y[h] = 0
				for g, a := range v {
					y[h] += b.m.gram[h*n+g] * a
				}
			}
			addOuter(dst, y, 1)
		}
	}
}
