package unmix

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
)

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
	l := Line{Component: component, Points: points, DF: len(points) - 2,
		Slope: math.NaN(), Intercept: math.NaN(), InterceptSE: math.NaN()}
	n := float64(len(points))
	x, y := make([]float64, len(points)), make([]float64, len(points))
	for i, p := range points {
		x[i], y[i] = p.Given, p.Found
	}
	mean, squares := stat.Mean(x, nil), stat.Variance(x, nil)*(n-1)
	if l.DF < 0 || squares == 0 {
		return l
	}
	l.Intercept, l.Slope = stat.LinearRegression(x, y, nil, false)
	if l.DF < 1 {
		return l
	}
	var rss float64
	for i := range x {
		d := y[i] - l.Intercept - l.Slope*x[i]
		rss += d * d
	}
	l.InterceptSE = math.Sqrt(rss / float64(l.DF) * (1/n + mean*mean/squares))
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
