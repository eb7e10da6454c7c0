package unmix

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
)

// Standard is one corrected bottle of known composition.
type Standard struct {
	ID    string
	Batch string
	EEM   *eem.EEM           // corrected like the samples, any grid
	Conc  map[string]float64 // component → amount in the bottle (0 where named as 0)
}

// Line is what the standards of one component say about their own calibration
// line: signal against amount, where signal is the amount that the reference
// itself finds. A line through the origin has slope 1 and intercept 0.
type Line struct {
	Component   string
	Points      []Point
	Slope       float64
	Intercept   float64 // in the amount's unit
	InterceptSE float64 // NaN with fewer than 3 points
	DF          int     // points − 2
}

// Point is one standard on a Line.
type Point struct {
	ID, Batch    string
	Given, Found float64
}

// Doubtful says whether the intercept differs from 0 at the 5 % level (two-sided
// Student t with DF degrees of freedom) and by more than least standard errors.
func (l Line) Doubtful(least float64) (t, limit float64, doubtful bool) {
	if l.DF < 1 || math.IsNaN(l.InterceptSE) || l.InterceptSE == 0 {
		return math.NaN(), math.NaN(), false
	}
	t = math.Abs(l.Intercept) / l.InterceptSE
	limit = max(least, distuv.StudentsT{Mu: 0, Sigma: 1, Nu: float64(l.DF)}.Quantile(0.975))
	return t, limit, t > limit
}

// FromStandards builds references on grid g: for every cell the slope of
// intensity against amount, through the origin, over the levels of all batches
// (mixtures are resolved by least squares). A standard takes part in a cell only
// where its number was measured, so that clipped and over-absorbing cells are
// left out; a cell where the standards left do not determine a component is NaN.
// names gives the components and their order, units their amounts' units.
func FromStandards(g eem.Grid, unit eem.Unit, names, units []string, standards []Standard) (*Set, []Line, error) {
	if len(standards) == 0 || len(names) == 0 {
		return nil, nil, errors.New("the run sheet has no standard with a concentration; add rows of kind standard with conc: columns, or name a reference file ([quantify] references)")
	}
	slopes, err := slopesByCell(g, names, standards)
	if err != nil {
		return nil, nil, err
	}
	s := &Set{Grid: g, Unit: unit, Method: "references", Origin: "standards of the run sheet"}
	for f, name := range names {
		c := Component{Name: name, AmountUnit: units[f], Surface: slopes[f]}
		c.Ex, c.Em, c.Scale = rankOne(g, c.Surface)
		c.ExDetermined = seen(c.Ex, c.Em, func(j, k int) bool { return !math.IsNaN(c.Surface[g.Index(j, k)]) })
		c.EmDetermined = seen(c.Em, c.Ex, func(k, j int) bool { return !math.IsNaN(c.Surface[g.Index(j, k)]) })
		if c.AmountUnit == "" {
			c.AmountUnit = UnitUnstated
		}
		c.Highest, c.Levels = levels(name, standards)
		s.Components = append(s.Components, c)
	}
	if err := s.Check(); err != nil {
		return nil, nil, err
	}
	return s, s.lines(standards), nil
}

// UnitUnstated stands where the run sheet gives a component's amounts without a unit.
const UnitUnstated = "unstated"

// minSeen is the least share of the other mode's energy that the cells of a
// wavelength must show for its loading to mean anything; below it the loading
// is noise over next to nothing (common practice, no source).
const minSeen = 0.01

// seen says which loadings v the cells present determine.
func seen(v, other []float64, present func(i, l int) bool) []bool {
	out := make([]bool, len(v))
	for i := range v {
		var in, all float64
		for l, o := range other {
			if math.IsNaN(o) {
				continue
			}
			all += o * o
			if present(i, l) {
				in += o * o
			}
		}
		out[i] = !math.IsNaN(v[i]) && in >= minSeen*all
	}
	return out
}

// slopesByCell returns F surfaces of slopes, J × K each. Cells in which the same
// standards are present share one factorisation.
func slopesByCell(g eem.Grid, names []string, standards []Standard) ([][]float64, error) {
	on, conc := stacked(g, names, standards)
	out := make([][]float64, len(names))
	for f := range out {
		out[f] = make([]float64, g.Cells())
		for i := range out[f] {
			out[f][i] = math.NaN()
		}
		if !slices.ContainsFunc(conc, func(c []float64) bool { return c[f] > 0 }) {
			return nil, fmt.Errorf("no standard has a concentration above 0 of %q; give one, or remove its conc: column", names[f])
		}
	}
	solvers := map[string]*slopeSolver{}
	present := make([]byte, len(standards))
	for i := range g.Cells() {
		presentAt(present, on, i)
		solver, ok := solvers[string(present)]
		if !ok {
			solver = newSlopeSolver(conc, present)
			solvers[string(present)] = solver
		}
		solver.solve(out, on, i)
	}
	return out, nil
}

// stacked brings the standards to grid g and lists their amounts.
func stacked(g eem.Grid, names []string, standards []Standard) (on []*eem.EEM, conc [][]float64) {
	on = make([]*eem.EEM, len(standards))
	conc = make([][]float64, len(standards))
	for s, st := range standards {
		on[s] = st.EEM
		if !st.EEM.Grid.Equal(g) {
			on[s] = st.EEM.Regrid(g)
		}
		conc[s] = make([]float64, len(names))
		for f, name := range names {
			conc[s][f] = st.Conc[name]
		}
	}
	return on, conc
}

// presentAt marks the standards whose number of cell i was measured.
func presentAt(present []byte, on []*eem.EEM, i int) {
	for s := range on {
		present[s] = '0'
		if on[s].Why[i] == eem.Measured && !math.IsNaN(on[s].F[i]) {
			present[s] = '1'
		}
	}
}

// slopeSolver finds the slopes of one cell for one pattern of present standards.
type slopeSolver struct {
	rows  []int // standards present
	comps []int // components they determine
	pinv  *mat.Dense
}

// newSlopeSolver keeps the components that have an amount above 0 in some
// present standard; when their columns are dependent (two components that only
// occur in a fixed ratio) it keeps none.
func newSlopeSolver(conc [][]float64, present []byte) *slopeSolver {
	s := &slopeSolver{}
	for r, p := range present {
		if p == '1' {
			s.rows = append(s.rows, r)
		}
	}
	if len(s.rows) == 0 {
		return s
	}
	for f := range conc[0] {
		if slices.ContainsFunc(s.rows, func(r int) bool { return conc[r][f] > 0 }) {
			s.comps = append(s.comps, f)
		}
	}
	// An absent component's share in a mixture cannot be taken out of it.
	if len(s.comps) == 0 || len(s.comps) > len(s.rows) {
		s.comps = nil
		return s
	}
	c := mat.NewDense(len(s.rows), len(s.comps), nil)
	norm := make([]float64, len(s.comps))
	for a, r := range s.rows {
		for b, f := range s.comps {
			c.Set(a, b, conc[r][f])
			norm[b] = math.Hypot(norm[b], conc[r][f])
		}
	}
	// Unit columns: amounts in mol/L and in mg/L differ by many powers of ten.
	for b := range s.comps {
		for a := range s.rows {
			c.Set(a, b, c.At(a, b)/norm[b])
		}
	}
	var qr mat.QR
	qr.Factorize(c)
	if qr.Cond() > 1e6 {
		s.comps = nil
		return s
	}
	s.pinv = &mat.Dense{}
	eye := mat.NewDiagDense(len(s.rows), nil)
	for a := range s.rows {
		eye.SetDiag(a, 1)
	}
	if err := qr.SolveTo(s.pinv, false, mat.DenseCopyOf(eye)); err != nil {
		s.comps, s.pinv = nil, nil
		return s
	}
	for b := range s.comps {
		for a := range s.rows {
			s.pinv.Set(b, a, s.pinv.At(b, a)/norm[b])
		}
	}
	return s
}

func (s *slopeSolver) solve(out [][]float64, on []*eem.EEM, i int) {
	for b, f := range s.comps {
		v := 0.0
		for a, r := range s.rows {
			v += s.pinv.At(b, a) * on[r].F[i]
		}
		out[f][i] = v
	}
}

func levels(name string, standards []Standard) (highest float64, n int) {
	var seen []float64
	for _, s := range standards {
		if v := s.Conc[name]; v > 0 && !slices.Contains(seen, v) {
			seen = append(seen, v)
			highest = max(highest, v)
		}
	}
	return highest, len(seen)
}

// lines projects every standard on the references without the constraint of
// sign and fits found against given with an intercept.
func (s *Set) lines(standards []Standard) []Line {
	ids := make([]string, len(standards))
	es := make([]*eem.EEM, len(standards))
	for i, st := range standards {
		ids[i], es[i] = st.ID, st.EEM
	}
	found := s.leastSquares(eem.NewCube(s.Grid, ids, es))
	out := make([]Line, s.Len())
	for f, c := range s.Components {
		l := Line{Component: c.Name}
		for i, st := range standards {
			given, named := st.Conc[c.Name]
			if named && (given > 0 || isBlankFor(st)) {
				l.Points = append(l.Points, Point{ID: st.ID, Batch: st.Batch, Given: given, Found: found[i][f]})
			}
		}
		out[f] = FitLine(c.Name, l.Points)
	}
	return out
}

// isBlankFor says whether the standard is a zero level: it names no amount above
// zero at all. Zeros of other components' standards do not count as a level.
func isBlankFor(s Standard) bool {
	for _, v := range s.Conc {
		if v > 0 {
			return false
		}
	}
	return true
}

// FitLine fits found against given by a straight line with an intercept, least
// squares. What the points do not determine is NaN.
func FitLine(component string, points []Point) Line {
	l := Line{Component: component, Points: points, DF: len(points) - 2}
	n := float64(len(l.Points))
	l.Intercept, l.InterceptSE, l.Slope = math.NaN(), math.NaN(), math.NaN()
	if l.DF < 0 {
		return l
	}
	var mx, my float64
	for _, p := range l.Points {
		mx, my = mx+p.Given/n, my+p.Found/n
	}
	var sxx, sxy float64
	for _, p := range l.Points {
		sxx += (p.Given - mx) * (p.Given - mx)
		sxy += (p.Given - mx) * (p.Found - my)
	}
	if sxx == 0 {
		return l
	}
	l.Slope = sxy / sxx
	l.Intercept = my - l.Slope*mx
	if l.DF < 1 {
		return l
	}
	var rss float64
	for _, p := range l.Points {
		d := p.Found - l.Intercept - l.Slope*p.Given
		rss += d * d
	}
	l.InterceptSE = math.Sqrt(rss / float64(l.DF) * (1/n + mx*mx/sxx))
	return l
}

// leastSquares resolves every sample without the constraint of sign.
func (s *Set) leastSquares(c *eem.Cube) [][]float64 {
	a, cells := s.Matrix()
	n := s.Len()
	out := make([][]float64, c.Len())
	for i := range out {
		out[i] = make([]float64, n)
		var rows, b []float64
		x, why := c.Sample(i), c.SampleWhy(i)
		for r, cell := range cells {
			if why[cell] == eem.Measured && !math.IsNaN(x[cell]) {
				rows = append(rows, a[r*n:(r+1)*n]...)
				b = append(b, x[cell])
			}
		}
		for f := range out[i] {
			out[i][f] = math.NaN()
		}
		if len(b) < n {
			continue
		}
		norm := unitColumns(rows, n)
		var q mat.QR
		q.Factorize(mat.NewDense(len(b), n, rows))
		sol := mat.NewDense(n, 1, nil)
		var ill mat.Condition
		if err := q.SolveTo(sol, false, mat.NewDense(len(b), 1, b)); err != nil && !errors.As(err, &ill) {
			continue
		}
		for f := range out[i] {
			out[i][f] = sol.At(f, 0) / norm[f]
		}
	}
	return out
}

// unitColumns scales the columns of a (rows × n) to norm 1 and returns the norms.
func unitColumns(a []float64, n int) []float64 {
	norm := make([]float64, n)
	for i, v := range a {
		norm[i%n] = math.Hypot(norm[i%n], v)
	}
	for i := range a {
		if norm[i%n] > 0 {
			a[i] /= norm[i%n]
		}
	}
	return norm
}

// String tells the line in words.
func (l Line) String() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: slope %.4g, intercept %.3g", l.Component, l.Slope, l.Intercept)
	if !math.IsNaN(l.InterceptSE) {
		fmt.Fprintf(&b, " ± %.2g (standard error, %d points)", l.InterceptSE, len(l.Points))
	}
	return b.String()
}
