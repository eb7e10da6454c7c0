package unmix

import (
	"encoding/json"
	"errors"
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

// ModelVersion is the version of the model file that this module writes.
const ModelVersion = 1

// Model is a fitted model with everything that scoring a new bottle needs: the
// file model.json.
type Model struct {
	Version    int             `json:"version"`
	Method     string          `json:"method"`
	Title      string          `json:"title"`
	Unit       eem.Unit        `json:"unit"`
	Grid       eem.Grid        `json:"grid"`
	Components modelComponents `json:"components"`
	Cells      []int           `json:"cells"` // indices ex·K + em of the cells that the fit used
	Samples    []string        `json:"samples"`
	Explained  *float64        `json:"explained_percent"`
	// Corrections are the steps that were done to the intensities, and Settings
	// (TOML) the settings in force: bands, scale and limits that a new bottle is
	// treated with, whatever its own survey says.
	Corrections []string  `json:"corrections"`
	Settings    string    `json:"settings"`
	Likeness    *Likeness `json:"likeness,omitempty"`
	// Yardstick is what noise looks like in the residuals of the model's own bottles; a
	// new bottle's are held against it, whatever else is measured beside. nil: unknown.
	Yardstick *Yardstick `json:"yardstick,omitempty"`
	// Instrument is how well the measurements behind the model repeat themselves; it
	// stands in for what a new batch is too small to tell. nil: unknown.
	Instrument *Instrument `json:"instrument,omitempty"`
	// Errors are those of the spectra as contributions see them; files of former
	// versions lack them.
	Errors   []SpectraError `json:"spectra_errors,omitempty"`
	Authors  []string       `json:"authors"`
	Citation string         `json:"citation"`
	Licence  string         `json:"licence"`
}

// Instrument is the noise of a detector and the repeatability of a measurement.
type Instrument struct {
	ReadNoise float64 `json:"read_noise_counts,omitempty"`    // standard deviation of a cell without light
	ShotNoise float64 `json:"shot_noise_per_count,omitempty"` // variance for each count of light
	Blanks    int     `json:"blanks,omitempty"`               // on which these rest; 0: unknown
	Repeat    float64 `json:"repeatability,omitempty"`        // relative standard deviation of one measurement
	RepeatDF  float64 `json:"repeatability_df,omitempty"`     // degrees of freedom; 0: unknown
}

// ModelComponent is one component of a model file. A loading that the data do
// not determine is null.
type ModelComponent struct {
	Name       string     `json:"name"`
	AmountUnit string     `json:"amount_unit,omitempty"`
	Ex         []*float64 `json:"excitation"`
	Em         []*float64 `json:"emission"`
	Scale      float64    `json:"scale"`
	Surface    []*float64 `json:"surface,omitempty"`
	Highest    float64    `json:"highest_standard,omitempty"`
	Levels     int        `json:"levels,omitempty"`
	ExU        []*float64 `json:"excitation_standard_uncertainty,omitempty"`
	EmU        []*float64 `json:"emission_standard_uncertainty,omitempty"`
}

// NewModel freezes a set.
func NewModel(s *Set, title string) *Model {
	m := &Model{Version: ModelVersion, Method: s.Method, Title: title, Unit: s.Unit, Grid: s.Grid,
		Cells: []int{}, Samples: []string{}, Corrections: []string{}, Authors: []string{}}
	for _, c := range s.Components {
		m.Components = append(m.Components, ModelComponent{Name: c.Name, AmountUnit: c.AmountUnit, Scale: c.Scale,
			Ex: toNull(c.Ex), Em: toNull(c.Em), Surface: toNull(c.Surface), Highest: c.Highest, Levels: c.Levels,
			ExU: toNull(c.ExU), EmU: toNull(c.EmU)})
	}
	return m
}

// Set returns the components of a model, on the cells that its fit used.
func (m *Model) Set() *Set {
	s := &Set{Grid: m.Grid, Unit: m.Unit, Method: "model", Origin: m.Title, Errors: m.Errors}
	for _, c := range m.Components {
		s.Components = append(s.Components, Component{Name: c.Name, AmountUnit: c.AmountUnit, Scale: c.Scale,
			Ex: fromNull(c.Ex), Em: fromNull(c.Em), Surface: fromNull(c.Surface), Highest: c.Highest, Levels: c.Levels,
			ExU: fromNull(c.ExU), EmU: fromNull(c.EmU)})
	}
	if len(m.Cells) > 0 {
		s.Mask = make([]bool, m.Grid.Cells())
		for _, i := range m.Cells {
			s.Mask[i] = true
		}
	}
	return s
}

// ParseModel reads a model file. Errors name the file and what is wrong.
func ParseModel(name string, data []byte) (*Model, error) {
	m := &Model{}
	if err := json.Unmarshal(data, m); err != nil {
		var syntax *json.SyntaxError
		if errors.As(err, &syntax) {
			line := 1 + strings.Count(string(data[:min(int(syntax.Offset), len(data))]), "\n")
			return nil, fmt.Errorf("%s:%d: not a model file: %w", name, line, err)
		}
		return nil, fmt.Errorf("%s: not a model file: %w", name, err)
	}
	switch {
	case m.Version == 0 || len(m.Components) == 0:
		return nil, fmt.Errorf("%s: not a model file: version or components are missing", name)
	case m.Version > ModelVersion:
		return nil, fmt.Errorf("%s: model file of version %d; this program reads up to %d: update it", name, m.Version, ModelVersion)
	}
	if err := m.check(); err != nil {
		return nil, fmt.Errorf("%s: %w; take the file as the program wrote it", name, err)
	}
	return m, nil
}

// toNull and fromNull let NaN pass through JSON.
func toNull(v []float64) []*float64 {
	if v == nil {
		return nil
	}
	out := make([]*float64, len(v))
	for i := range v {
		if !math.IsNaN(v[i]) {
			out[i] = &v[i]
		}
	}
	return out
}

func fromNull(v []*float64) []float64 {
	if v == nil {
		return nil
	}
	out := make([]float64, len(v))
	for i, p := range v {
		out[i] = math.NaN()
		if p != nil {
			out[i] = *p
		}
	}
	return out
}
