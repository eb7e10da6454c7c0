package unmix

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"strings"

	"tarnlight/eem"
)

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
