package unmix

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// Component is one fluorescing component on the grid of its Set.
//
// A component that was resolved without references has loadings with maximum 1,
// so that its contribution to a bottle is the intensity at its maximum (Fmax) and
// AmountUnit is empty. A component built from standards has a Surface in
// intensity per AmountUnit; its loadings are then the nearest rank-one form of
// that surface.
type Component struct {
	Name       string
	AmountUnit string    // unit of the contribution; empty: the intensity unit (Fmax)
	Ex         []float64 // J, maximum 1, NaN not determined
	Em         []float64 // K, maximum 1, NaN not determined
	Scale      float64   // intensity per AmountUnit at the maximum of both loadings; 1 without AmountUnit
	Surface    []float64 // J × K, intensity per AmountUnit, NaN not determined; nil: Scale·Ex·Em

	// ExU and EmU are standard uncertainties of the loadings; nil while nobody
	// knows them. ExDetermined and EmDetermined say which loadings the data
	// determine; nil means all that are numbers.
	ExU, EmU                   []float64
	ExDetermined, EmDetermined []bool

	Highest float64 // highest standard, AmountUnit; 0 where there is none
	Levels  int     // how many different concentrations stand behind it
}

// At returns the modelled intensity of cell (j, k) per unit of contribution, NaN
// where it is not determined.
func (c *Component) At(g eem.Grid, j, k int) float64 {
	if c.Surface != nil {
		return c.Surface[g.Index(j, k)]
	}
	return c.Scale * c.Ex[j] * c.Em[k]
}

// Set is a list of components on one grid, the columns of the mixing model.
type Set struct {
	Grid       eem.Grid
	Unit       eem.Unit // intensity unit of the surfaces
	Method     string   // "references", "parafac", "model"
	Origin     string   // where the components come from, in words
	Components []Component
	Mask       []bool // J × K: cells of the mixing model; nil means all

	// Errors are what is known of the errors of spectra that come from a model file,
	// in the place of the components' ExU and EmU; nil means nobody knows.
	Errors []SpectraError
}

// Len returns the number of components.
func (s *Set) Len() int { return len(s.Components) }

// Names returns the components' names in order.
func (s *Set) Names() []string {
	names := make([]string, s.Len())
	for f := range s.Components {
		names[f] = s.Components[f].Name
	}
	return names
}

// Matrix returns the mixing model as cells × components, row-major, for the grid
// cells in which every component is determined, and the indices of those cells.
func (s *Set) Matrix() (a []float64, cells []int) {
	n := s.Len()
	row := make([]float64, n)
	for j := range s.Grid.Ex.Len() {
		for k := range s.Grid.Em.Len() {
			known := s.Mask == nil || s.Mask[s.Grid.Index(j, k)]
			for f := range s.Components {
				row[f] = s.Components[f].At(s.Grid, j, k)
				known = known && !math.IsNaN(row[f])
			}
			if known {
				a = append(a, row...)
				cells = append(cells, s.Grid.Index(j, k))
			}
		}
	}
	return a, cells
}

// OnGrid returns the set interpolated linearly onto grid g. Loadings outside the
// set's own range are not determined there (NaN): spectra are never extrapolated.
func (s *Set) OnGrid(g eem.Grid) *Set {
	if s.Grid.Equal(g) {
		return s
	}
	out := *s
	out.Grid = g
	out.Mask = maskOn(s.Grid, g, s.Mask)
	out.Components = make([]Component, s.Len())
	for f, c := range s.Components {
		d := c
		d.Ex, d.Em = onAxis(s.Grid.Ex, g.Ex, c.Ex), onAxis(s.Grid.Em, g.Em, c.Em)
		d.ExU, d.EmU = onAxis(s.Grid.Ex, g.Ex, c.ExU), onAxis(s.Grid.Em, g.Em, c.EmU)
		d.ExDetermined, d.EmDetermined = nil, nil
		if c.Surface != nil {
			d.Surface = eem.FromCells(s.Grid, s.Unit, c.Surface).Regrid(g).F
		}
		out.Components[f] = d
	}
	return &out
}

// maskOn brings a mask to grid g: a point counts where all its neighbours do.
func maskOn(from, to eem.Grid, mask []bool) []bool {
	if mask == nil {
		return nil
	}
	e := eem.New(from, eem.Counts)
	for i, in := range mask {
		if in {
			e.F[i], e.Why[i] = 1, eem.Measured
		}
	}
	e = e.Regrid(to)
	out := make([]bool, to.Cells())
	for i := range out {
		out[i] = e.Why[i] == eem.Measured
	}
	return out
}

func onAxis(from, to eem.Axis, y []float64) []float64 {
	if y == nil {
		return nil
	}
	out := make([]float64, to.Len())
	for i := range out {
		out[i] = from.Interp(y, to.At(i))
	}
	return out
}

// Covered returns, for every component, the share of its energy (Σ surface² over
// the cells of the set) that lies on cells which grid g covers.
func (s *Set) Covered(g eem.Grid) []float64 {
	out := make([]float64, s.Len())
	for f := range s.Components {
		var in, all float64
		for j := range s.Grid.Ex.Len() {
			for k := range s.Grid.Em.Len() {
				v := s.Components[f].At(s.Grid, j, k)
				if math.IsNaN(v) || (s.Mask != nil && !s.Mask[s.Grid.Index(j, k)]) {
					continue
				}
				all += v * v
				if g.Ex.Covers(s.Grid.Ex.At(j)) && g.Em.Covers(s.Grid.Em.At(k)) {
					in += v * v
				}
			}
		}
		if all > 0 {
			out[f] = in / all
		}
	}
	return out
}

// Check says whether every component has something to fit with.
func (s *Set) Check() error {
	if s.Len() == 0 {
		return fmt.Errorf("%s: no component", s.Origin)
	}
	for _, c := range s.Components {
		some := false
		for j := range s.Grid.Ex.Len() {
			for k := range s.Grid.Em.Len() {
				if v := c.At(s.Grid, j, k); !math.IsNaN(v) && v != 0 {
					some = true
				}
			}
		}
		if !some {
			return fmt.Errorf("%s: component %q has no value above 0 on the survey's grid (%s)", s.Origin, c.Name, s.Grid)
		}
	}
	return nil
}

// rankOne returns the non-negative loadings ex (J), em (K), maximum 1, and the
// scale whose product is nearest to the surface m (J × K, NaN missing) in least
// squares, by alternating projections. Loadings that no cell determines are NaN.
func rankOne(g eem.Grid, m []float64) (ex, em []float64, scale float64) {
	nj, nk := g.Ex.Len(), g.Em.Len()
	ex, em = make([]float64, nj), make([]float64, nk)
	for k := range em {
		em[k] = 1
	}
	for range 200 {
		before := scale
		project(ex, em, func(j, k int) float64 { return m[g.Index(j, k)] })
		toMax(ex)
		project(em, ex, func(k, j int) float64 { return m[g.Index(j, k)] })
		scale = toMax(em)
		if math.Abs(scale-before) <= 1e-14*scale {
			break
		}
	}
	return ex, em, scale
}

// project sets dst[i] = Σ m(i,l)·other[l] / Σ other[l]², over the cells present,
// not below 0; NaN where no cell is present.
func project(dst, other []float64, m func(i, l int) float64) {
	for i := range dst {
		num, den, seen := 0.0, 0.0, false
		for l, o := range other {
			if v := m(i, l); !math.IsNaN(v) && !math.IsNaN(o) {
				num, den, seen = num+v*o, den+o*o, true
			}
		}
		switch {
		case !seen:
			dst[i] = math.NaN()
		case den == 0:
			dst[i] = 0
		default:
			dst[i] = max(0, num/den)
		}
	}
}

// toMax divides v by its maximum, which it returns.
func toMax(v []float64) float64 {
	m := 0.0
	for _, x := range v {
		if x > m {
			m = x
		}
	}
	if m > 0 {
		for i := range v {
			v[i] /= m
		}
	}
	return m
}
