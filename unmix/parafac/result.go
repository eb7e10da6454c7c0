package parafac

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
)

// Result is a fitted model of a cube with I samples on J × K wavelengths.
type Result struct {
	Status     Status
	Grid       eem.Grid
	Unit       eem.Unit
	Components int      // F
	Held       []string // F: name of the spectrum held in that place, else empty
	IDs        []string // I

	// Scores, I × F row-major, are Fmax: the contribution of the component at its
	// own peak, in the cube's unit. Fitted says which samples took part; the
	// scores of the others are 0 and mean nothing.
	Scores  []float64
	ScoreSE []float64 // I × F
	Fitted  []bool    // I

	// Ex and Em are the loadings, F × J and F × K, of maximum 1; components are
	// ordered by emission peak, then excitation peak. A loading that is not
	// determined is damped: the data do not say what it is, so plot a gap.
	Ex, Em                     [][]float64
	ExSE, EmSE                 [][]float64
	ExDetermined, EmDetermined [][]bool

	SSE       float64   // Σ residual², Unit², over the cells of the fitted samples
	SST       float64   // Σ x² of the same cells
	Explained float64   // percent: 100 (1 − SSE/SST)
	SampleSSE []float64 // I
	SampleSST []float64 // I
	Cells     []int     // I: cells used
	ExSSE     []float64 // J
	EmSSE     []float64 // K

	Loss       float64 // what the fit lowered: scaled, weighted, over ‖x‖² of the same
	Iterations int     // of the best start
	Starts     []Start
	// CoreConsistency, percent, in the fit's own scale; see the function.
	CoreConsistency float64
	// TripleCosine is the one of largest size among pairs of components, TriplePair.
	TripleCosine float64
	TriplePair   [2]int
	// Structure is the mean correlation of neighbouring residuals.
	Structure   float64
	Certificate float64 // δ = √(g'H⁺g)/σ: distance from the optimum in standard errors, jointly
	Revived     int     // components that died on the way and were set again

	// Leverage, I, is the diagonal of A(A'A)⁻¹A', and Influence, I, the largest
	// move of a loading when the sample is left out, in standard errors of the
	// loading: at 1 the sample alone makes the error of a loading.
	Leverage, Influence []float64

	Notes []eem.Note

	order        []int       // place of each component in the fit
	exRes, emRes [][]bool    // F × J and F × K: not damped
	moves        *moves      // nil where the errors are not known
	bentEx       [][]float64 // see Bent
	bentEm       [][]float64
}

// Start is one start of a fit.
type Start struct {
	Loss       float64 // as Result.Loss
	Iterations int
	Kept       bool // was among the best after screening and went on
	Agrees     bool // reached the best loss and spectra
}

// ModelTo writes the modelled cells of sample i, J × K in the cube's unit. It
// panics when dst has another length.
func (r *Result) ModelTo(dst []float64, i int) {
	nj, nk := r.Grid.Ex.Len(), r.Grid.Em.Len()
	if len(dst) != nj*nk {
		panic(fmt.Sprintf("parafac: %d cells for a grid of %d", len(dst), nj*nk))
	}
	clear(dst)
	for f, a := range r.Scores[i*r.Components : (i+1)*r.Components] {
		if a == 0 {
			continue
		}
		for j, b := range r.Ex[f] {
			axpy(a*b, r.Em[f], dst[j*nk:(j+1)*nk])
		}
	}
}

// result turns the factors into what the caller sees.
func (s *als) result(c *eem.Cube, set *Settings) *Result {
	f := s.f
	r := &Result{
		Grid: s.grid, Unit: c.Unit, Components: f, IDs: slices.Clone(c.IDs),
		Scores: make([]float64, s.total*f), ScoreSE: make([]float64, s.total*f), Fitted: make([]bool, s.total),
		Iterations: s.iter, Revived: s.revived, Notes: slices.Clone(s.notes),
	}
	order := s.order()
	r.order = order
	r.Held = make([]string, f)
	for to, from := range order {
		if from < len(set.Hold) {
			r.Held[to] = set.Hold[from].Name
		}
		b, sb := s.loading(s.b, s.j, from)
		e, sc := s.loading(s.c, s.k, from)
		r.Ex, r.Em = append(r.Ex, b), append(r.Em, e)
		for row, i := range s.sample {
			r.Scores[i*f+to] = s.a[row*f+from] * sb * sc * s.scale[row]
		}
	}
	for _, i := range s.sample {
		r.Fitted[i] = true
	}
	s.residuals(c, r)
	r.CoreConsistency, r.Structure = s.residualTests()
	t, pair := s.tripleCosine()
	r.TripleCosine = t
	r.TriplePair = [2]int{slices.Index(order, pair[0]), slices.Index(order, pair[1])}
	slices.Sort(r.TriplePair[:])
	return r
}

// loading returns column f of x divided by its entry of largest size, and that
// entry.
func (s *als) loading(x []float64, n, f int) ([]float64, float64) {
	v, peak := make([]float64, n), 0.0
	for i := range v {
		v[i] = x[i*s.f+f]
		if math.Abs(v[i]) > math.Abs(peak) {
			peak = v[i]
		}
	}
	if peak == 0 {
		return v, 0
	}
	for i := range v {
		v[i] /= peak
	}
	return v, peak
}

// order sorts components by emission peak, then excitation peak.
func (s *als) order() []int {
	ex, em, idx := make([]int, s.f), make([]int, s.f), make([]int, s.f)
	for f := range idx {
		idx[f] = f
		v, _ := s.loading(s.b, s.j, f)
		w, _ := s.loading(s.c, s.k, f)
		ex[f], em[f] = floats.MaxIdx(v), floats.MaxIdx(w)
	}
	slices.SortStableFunc(idx, func(x, y int) int {
		return cmp.Or(cmp.Compare(em[x], em[y]), cmp.Compare(ex[x], ex[y]))
	})
	return idx
}

// residuals fills the sums of squares, in the cube's unit, from the residuals
// themselves.
func (s *als) residuals(c *eem.Cube, r *Result) {
	r.SampleSSE, r.SampleSST, r.Cells = make([]float64, s.total), make([]float64, s.total), make([]int, s.total)
	r.ExSSE, r.EmSSE = make([]float64, s.j), make([]float64, s.k)
	model := make([]float64, s.grid.Cells())
	for _, i := range s.sample {
		r.ModelTo(model, i)
		x, why := c.Sample(i), c.SampleWhy(i)
		for q := range s.p {
			j, k := int(s.cj[q]), int(s.ck[q])
			at := j*s.k + k
			if !usable(x[at], why[at]) {
				continue
			}
			e := x[at] - model[at]
			r.SampleSSE[i] += e * e
			r.SampleSST[i] += x[at] * x[at]
			r.ExSSE[j] += e * e
			r.EmSSE[k] += e * e
			r.Cells[i]++
		}
		r.SSE += r.SampleSSE[i]
		r.SST += r.SampleSST[i]
	}
	r.Explained = 100 * (1 - r.SSE/r.SST)
}
