package unmix

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
)

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
	if s.pinv = pseudoInverse(s.amounts(conc)); s.pinv == nil {
		s.comps = nil
	}
	return s
}

// amounts is the part of conc that s is about, rows × comps.
func (s *slopeSolver) amounts(conc [][]float64) *mat.Dense {
	c := mat.NewDense(len(s.rows), len(s.comps), nil)
	for a, r := range s.rows {
		for b, f := range s.comps {
			c.Set(a, b, conc[r][f])
		}
	}
	return c
}

// pseudoInverse returns that of c, which it alters; nil where the columns are
// dependent.
func pseudoInverse(c *mat.Dense) *mat.Dense {
	rows, n := c.Dims()
	norm := unitColumns(c.RawMatrix().Data, n) // amounts in mol/L and in mg/L differ by many powers of ten
	var qr mat.QR
	qr.Factorize(c)
	if qr.Cond() > 1e6 {
		return nil
	}
	eye := mat.NewDense(rows, rows, nil)
	for a := range rows {
		eye.Set(a, a, 1)
	}
	inv := &mat.Dense{}
	if err := qr.SolveTo(inv, false, eye); err != nil {
		return nil
	}
	inv.Apply(func(b, _ int, v float64) float64 { return v / norm[b] }, inv)
	return inv
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
