package unmix

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strconv"
	"strings"

	"tarnlight/eem"
)

// The modes of a row of a component file.
const (
	ModeEx    = "excitation"
	ModeEm    = "emission"
	ModeScale = "scale" // wavelength empty; loading = intensity at the maximum per unit of amount
)

// ParseComponents reads components in the layout of components.csv: columns
// component, mode, wavelength_nm and loading, and where they are there
// standard_uncertainty, determined, unit, components and chosen. Columns stand in
// any order. rows[i] is at line[i] of the file name, for messages. Rows of
// candidate models that were not chosen are passed over. All components share
// one grid.
func ParseComponents(name string, header []string, rows [][]string, line []int) (*Set, error) {
	col := func(want string) int {
		return slices.IndexFunc(header, func(h string) bool { return strings.EqualFold(strings.TrimSpace(h), want) })
	}
	p := fileParser{name: name, line: line, byName: map[string]*spectra{},
		comp: col("component"), mode: col("mode"), nm: col("wavelength_nm"), load: col("loading"),
		u: col("standard_uncertainty"), det: col("determined"), unit: col("unit"), chosen: col("chosen")}
	for _, c := range []struct {
		at   int
		name string
	}{{p.comp, "component"}, {p.mode, "mode"}, {p.nm, "wavelength_nm"}, {p.load, "loading"}} {
		if c.at < 0 {
			return nil, fmt.Errorf("%s:1: no column %q; a reference file has the columns component, mode, wavelength_nm, loading", name, c.name)
		}
	}
	for i, r := range rows {
		if err := p.row(i, r); err != nil {
			return nil, err
		}
	}
	return p.set()
}

// spectra collects the rows of one component.
type spectra struct {
	first  int // line
	unit   string
	scale  float64
	points map[string][]loading // by mode
}

type loading struct {
	nm, v, u   float64
	determined bool
	line       int
}

type fileParser struct {
	name                                       string
	line                                       []int
	comp, mode, nm, load, u, det, unit, chosen int
	order                                      []string
	byName                                     map[string]*spectra
}

func (p *fileParser) row(i int, r []string) error {
	cell := func(c int) string {
		if c < 0 || c >= len(r) {
			return ""
		}
		return strings.TrimSpace(r[c])
	}
	number := func(c int) (float64, error) {
		s := cell(c)
		if s == "" {
			return math.NaN(), nil
		}
		v, err := strconv.ParseFloat(s, 64)
		if err != nil || math.IsInf(v, 0) {
			return 0, fmt.Errorf("%s:%d: %q is not a number; write it with a decimal point", p.name, p.line[i], s)
		}
		return v, nil
	}
	if p.chosen >= 0 && strings.EqualFold(cell(p.chosen), "false") {
		return nil
	}
	name := cell(p.comp)
	if name == "" {
		return fmt.Errorf("%s:%d: the component has no name", p.name, p.line[i])
	}
	s, ok := p.byName[name]
	if !ok {
		s = &spectra{first: p.line[i], scale: 1, points: map[string][]loading{}}
		p.byName[name] = s
		p.order = append(p.order, name)
	}
	if u := cell(p.unit); u != "" {
		s.unit = u
	}
	var err error
	l := loading{line: p.line[i], determined: !strings.EqualFold(cell(p.det), "false")}
	if l.v, err = number(p.load); err != nil {
		return err
	}
	if l.u, err = number(p.u); err != nil {
		return err
	}
	mode := strings.ToLower(cell(p.mode))
	switch mode {
	case ModeScale:
		if !(l.v > 0) {
			return fmt.Errorf("%s:%d: the scale of %q must be above 0", p.name, p.line[i], name)
		}
		s.scale = l.v
		return nil
	case ModeEx, ModeEm:
	default:
		return fmt.Errorf("%s:%d: mode %q; allowed are excitation, emission and scale", p.name, p.line[i], mode)
	}
	if l.nm, err = number(p.nm); err != nil {
		return err
	}
	if math.IsNaN(l.nm) {
		return fmt.Errorf("%s:%d: the wavelength is missing", p.name, p.line[i])
	}
	if l.v < 0 {
		return fmt.Errorf("%s:%d: loading %g of %q; a spectrum is not negative", p.name, p.line[i], l.v, name)
	}
	s.points[mode] = append(s.points[mode], l)
	return nil
}

// set makes components of the rows, all on one grid.
func (p *fileParser) set() (*Set, error) {
	if len(p.order) == 0 {
		return nil, fmt.Errorf("%s: no component; a reference file has one row a component, mode and wavelength", p.name)
	}
	out := &Set{Method: "references", Origin: p.name}
	for f, name := range p.order {
		s := p.byName[name]
		c := Component{Name: name, AmountUnit: s.unit, Scale: s.scale}
		var g eem.Grid
		var err error
		if g.Ex, err = s.axis(p.name, name, ModeEx); err != nil {
			return nil, err
		}
		if g.Em, err = s.axis(p.name, name, ModeEm); err != nil {
			return nil, err
		}
		c.Ex, c.ExU, c.ExDetermined = s.column(ModeEx)
		c.Em, c.EmU, c.EmDetermined = s.column(ModeEm)
		for _, v := range [][]float64{c.Ex, c.Em} {
			if m := toMax(v); m == 0 {
				return nil, fmt.Errorf("%s:%d: component %q has no loading above 0", p.name, s.first, name)
			} else if s.unit != "" {
				c.Scale *= m
			}
		}
		if f == 0 {
			out.Grid = g
		} else if !out.Grid.Equal(g) {
			return nil, fmt.Errorf("%s:%d: component %q is on other wavelengths (%s) than %q (%s); give all components on one grid",
				p.name, s.first, name, g, out.Components[0].Name, out.Grid)
		}
		out.Components = append(out.Components, c)
	}
	return out, nil
}

func (s *spectra) axis(file, name, mode string) (eem.Axis, error) {
	p := s.points[mode]
	sort.SliceStable(p, func(a, b int) bool { return p[a].nm < p[b].nm })
	if len(p) == 0 {
		return eem.Axis{}, fmt.Errorf("%s:%d: component %q has no %s rows", file, s.first, name, mode)
	}
	nm := make([]float64, len(p))
	for i := range p {
		nm[i] = p[i].nm
		if i > 0 && nm[i] == nm[i-1] {
			return eem.Axis{}, fmt.Errorf("%s:%d: component %q gives %s %g nm twice (before in line %d); is this the file of several models? keep one", file, p[i].line, name, mode, nm[i], p[i-1].line)
		}
	}
	a, err := eem.NewAxis(nm)
	if err != nil {
		return a, fmt.Errorf("%s:%d: component %q, %s: %w", file, s.first, name, mode, err)
	}
	return a, nil
}

// column returns loadings, standard uncertainties (nil when none is given) and
// which are determined.
func (s *spectra) column(mode string) (v, u []float64, det []bool) {
	some := false
	for _, l := range s.points[mode] {
		v, u, det = append(v, l.v), append(u, l.u), append(det, l.determined)
		some = some || !math.IsNaN(l.u)
	}
	if !some {
		u = nil
	}
	return v, u, det
}
