package unmix

import (
	"fmt"
	"math"
	"runtime"
	"slices"
	"sync"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
	"tarnlight/nnls"
)

// Fit says how well the model explains one bottle.
type Fit struct {
	Status    nnls.Status
	Cells     int     // measured cells used
	Explained float64 // 100·(1 − SSE/SST) over those cells, percent; NaN when the bottle holds only zeros
	RMS       float64 // of the residual, intensity unit
	Violation float64 // certificate of optimality, METHODS of nnls.Violation
	Condition float64 // of the unit-norm components on those cells
	HotEx     float64 // where the residual is largest, nm
	HotEm     float64
	Hot       float64 // and how large, intensity unit
	Usable    bool    // the contributions mean something
	Reason    string  // why they do not
}

// Resolution is a survey resolved against one set of components.
type Resolution struct {
	Set   *Set // on the cube's grid
	IDs   []string
	Value []float64 // I × F contributions, never negative; NaN where the bottle was not usable
	Fits  []Fit
}

// Quantify resolves every sample of the cube against the set by non-negative
// least squares over the cells that were measured; filled cells carry no weight.
// The answer of a bottle does not depend on the bottles beside it. A bottle with
// fewer cells than components is not usable, and its Fit says why. An error means
// that the set does not fit the cube.
func Quantify(c *eem.Cube, s *Set) (*Resolution, error) {
	if c.Unit != s.Unit && s.Unit != "" {
		return nil, fmt.Errorf("%s is in %s, the survey in %s; bring both to one unit ([intensity] unit)", s.Origin, s.Unit, c.Unit)
	}
	s = s.OnGrid(c.Grid)
	if err := s.Check(); err != nil {
		return nil, err
	}
	q, err := newQuantifier(s)
	if err != nil {
		return nil, err
	}
	r := &Resolution{Set: s, IDs: c.IDs, Fits: make([]Fit, c.Len()), Value: make([]float64, c.Len()*s.Len())}
	// A chunk at a time, so that memory does not grow with the survey.
	const chunk = 256
	for lo := 0; lo < c.Len(); lo += chunk {
		q.chunk(r, c, lo, min(lo+chunk, c.Len()))
	}
	return r, nil
}

// quantifier holds what all samples share.
type quantifier struct {
	n     int // components
	cells []int
	a     *mat.Dense // cells × n
	batch *nnls.Batch

	once  sync.Once
	whole float64 // condition number on all cells
}

func newQuantifier(s *Set) (*quantifier, error) {
	q := &quantifier{n: s.Len()}
	var data []float64
	data, q.cells = s.Matrix()
	if len(q.cells) < q.n {
		return nil, fmt.Errorf("%s: only %d cells know every one of the %d components; standards and samples hardly overlap", s.Origin, len(q.cells), q.n)
	}
	q.a = mat.NewDense(len(q.cells), q.n, data)
	var err error
	q.batch, err = nnls.NewBatch(q.a, nil)
	return q, err
}

// chunk resolves samples lo … hi−1.
func (q *quantifier) chunk(r *Resolution, c *eem.Cube, lo, hi int) {
	m := len(q.cells)
	b := mat.NewDense(hi-lo, m, nil)
	for i := lo; i < hi; i++ {
		x, why, row := c.Sample(i), c.SampleWhy(i), b.RawRowView(i-lo)
		for l, cell := range q.cells {
			row[l] = math.NaN()
			if why[cell] == eem.Measured {
				row[l] = x[cell]
			}
		}
	}
	dst := mat.NewDense(hi-lo, q.n, nil)
	results, err := q.batch.SolveTo(dst, b, nil)
	_ = err // it names the samples that results mark one by one
	var wg sync.WaitGroup
	next := make(chan int)
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for i := range next {
				q.judge(r, i, b.RawRowView(i-lo), dst.RawRowView(i-lo), results[i-lo])
			}
		})
	}
	for i := lo; i < hi; i++ {
		next <- i
	}
	close(next)
	wg.Wait()
}

// judge fills row i of r from the answer x of the right-hand side b.
func (q *quantifier) judge(r *Resolution, i int, b, x []float64, res nnls.Result) {
	fit := &r.Fits[i]
	fit.Status, fit.Violation, fit.Cells = res.Status, res.Violation, res.Rows
	value := r.Value[i*q.n : (i+1)*q.n]
	copy(value, x)
	fit.Usable = true
	switch {
	case res.Rows < q.n || res.Status == nnls.Unusable:
		fit.Usable, fit.Reason = false, fmt.Sprintf("%d measured cells for %d components", res.Rows, q.n)
	case res.Status != nnls.Optimal:
		fit.Usable, fit.Reason = false, "the solver stopped at its iteration limit"
	}
	if !fit.Usable {
		for f := range value {
			value[f] = math.NaN()
		}
		fit.Explained, fit.RMS, fit.Condition = math.NaN(), math.NaN(), math.NaN()
		fit.Hot, fit.HotEx, fit.HotEm = math.NaN(), math.NaN(), math.NaN()
		return
	}
	if slices.ContainsFunc(b, math.IsNaN) {
		fit.Condition = q.condition(b)
	} else {
		q.once.Do(func() { q.whole = q.condition(b) })
		fit.Condition = q.whole
	}
	q.residual(r.Set.Grid, fit, b, x)
}

// residual fills the parts of the fit that come from b − a·x.
func (q *quantifier) residual(g eem.Grid, fit *Fit, b, x []float64) {
	var sse, sst float64
	hot := -1
	fit.Hot = math.Inf(-1)
	for l, v := range b {
		if math.IsNaN(v) {
			continue
		}
		d := v - floats.Dot(q.a.RawRowView(l), x)
		sse, sst = sse+d*d, sst+v*v
		if d > fit.Hot {
			hot, fit.Hot = q.cells[l], d
		}
	}
	fit.RMS = math.Sqrt(sse / float64(fit.Cells))
	fit.Explained = math.NaN()
	if sst > 0 {
		fit.Explained = 100 * (1 - sse/sst)
	}
	fit.HotEx, fit.HotEm = g.Ex.At(hot/g.Em.Len()), g.Em.At(hot%g.Em.Len())
}

// condition returns the condition number of the unit-norm columns on the cells that
// b has, +Inf where they are dependent.
func (q *quantifier) condition(b []float64) float64 {
	sum := make([]float64, q.n*q.n)
	for l, v := range b {
		if math.IsNaN(v) {
			continue
		}
		row := q.a.RawRowView(l)
		for f, x := range row {
			for h := f; h < q.n; h++ {
				sum[f*q.n+h] += x * row[h]
			}
		}
	}
	gram := mat.NewSymDense(q.n, sum) // the upper triangle
	norm := make([]float64, q.n)
	for f := range norm {
		norm[f] = math.Sqrt(gram.At(f, f))
		if norm[f] == 0 {
			return math.Inf(1)
		}
	}
	for f := range norm {
		for h := f; h < q.n; h++ {
			gram.SetSym(f, h, gram.At(f, h)/norm[f]/norm[h])
		}
	}
	var eig mat.EigenSym
	if !eig.Factorize(gram, false) {
		return math.Inf(1)
	}
	v := eig.Values(nil)
	if v[0] <= 1e-15*v[q.n-1] {
		return math.Inf(1)
	}
	return math.Sqrt(v[q.n-1] / v[0])
}

// ModelTo writes the modelled cells of sample i, J × K, into dst; NaN where a
// component is not determined or the bottle was not usable.
func (r *Resolution) ModelTo(dst []float64, i int) {
	clear(dst)
	nk := r.Set.Grid.Em.Len()
	for f := range r.Set.Components {
		c, x := &r.Set.Components[f], r.Value[i*r.Set.Len()+f]
		if c.Surface != nil {
			for l, v := range c.Surface {
				dst[l] += x * v
			}
			continue
		}
		for j, ex := range c.Ex {
			row := dst[j*nk : (j+1)*nk]
			for k, em := range c.Em {
				row[k] += x * (c.Scale * ex * em)
			}
		}
	}
}

// ResidualTo writes x − model of sample i, J × K, into dst; NaN where either is
// missing.
func (r *Resolution) ResidualTo(dst, x []float64, i int) {
	r.ModelTo(dst, i)
	for l := range dst {
		dst[l] = x[l] - dst[l]
	}
}
