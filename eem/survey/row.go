package survey

import (
	"strings"
	"time"

	"tarnlight/eem"
)

// Kind says what a row of the run sheet measured.
type Kind string

// The kinds of a row.
const (
	Sample     Kind = "sample"      // a bottle whose contributions are wanted
	Blank      Kind = "blank"       // pure water: subtracted, sets the intensity scale
	FieldBlank Kind = "field-blank" // handled and reported like a sample, never subtracted
	Standard   Kind = "standard"    // known concentrations, used to calibrate
	Control    Kind = "control"     // known concentrations, not used to calibrate
	Spike      Kind = "spike"       // a bottle with a known addition; SpikeOf names the bottle without it
)

// Kinds lists every kind in the order of the documents.
var Kinds = []Kind{Sample, Blank, FieldBlank, Standard, Control, Spike}

// What a replicate repeats.
const (
	Laboratory = "laboratory" // the measurement, on liquid of the same bottle
	Field      = "field"      // the sampling too: a bottle of its own, filled at the same place and time
)

// Conc is one known concentration of a row, in the liquid scanned and before
// its dilution.
type Conc struct {
	Name  string // component
	Unit  string // empty when the column gives none
	Value float64
}

// Time is a date or a time as the sheet gave it. The zero Time was not given.
type Time struct {
	time.Time
	DateOnly bool   // the sheet gave no time of day
	Text     string // as written, or in ISO 8601 where a workbook held a date
}

// Day returns the calendar day as written, "2026-05-03", empty when no date was
// given. No time zone is applied: a day is the day of the place of measurement.
func (t Time) Day() string {
	if t.IsZero() {
		return ""
	}
	return t.Format(time.DateOnly)
}

// Row is one row of the run sheet. Optional numbers that are not given are NaN,
// except those with a default.
type Row struct {
	ID    string
	Kind  Kind
	Scans string // file, folder or glob, relative to the root, with slashes

	Absorbance       string  // file, relative to the root; empty when there is none
	AbsorbancePathCM float64 // cm, > 0, default 1

	Setup, Site, Batch string
	Measured, Sampled  Time
	Blanks             []string // ids, also of other batches; empty: those of the batch

	Dilution           float64 // final / sample volume of the liquid scanned, ≥ 1, default 1
	AbsorbanceDilution float64 // the same for the absorbance file, ≥ 1, default Dilution

	ReplicateOf, SpikeOf    string // ids
	ReplicateKind           string // of what ReplicateOf names: Laboratory (also empty) or Field
	Exclude, ExcludeFromFit string // reasons; empty: the row takes part

	DOC          float64 // dissolved organic carbon, mg/L, NaN unknown
	TemperatureC float64 // °C, NaN unknown
	Conc         []Conc  // in the order of the sheet's columns

	Cells []string // as read, one for each of Sheet.Columns
	Line  int      // in Sheet.Path, from 1
}

// Sheet is a run sheet whose rows have been checked against each other and
// against the settings.
type Sheet struct {
	Path    string
	Columns []string // the header as written, unknown columns included
	Rows    []Row    // in the order of the sheet
	Notes   []eem.Note
}

// Find returns the row of an id.
func (s *Sheet) Find(id string) (*Row, bool) {
	for i := range s.Rows {
		if s.Rows[i].ID == id {
			return &s.Rows[i], true
		}
	}
	return nil, false
}

// kindNames lists the kinds for messages.
func kindNames() string {
	names := make([]string, len(Kinds))
	for i, k := range Kinds {
		names[i] = string(k)
	}
	return strings.Join(names, ", ")
}
