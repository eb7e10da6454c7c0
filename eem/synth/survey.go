package synth

import (
	"fmt"
	"hash/fnv"
	"math"
	"math/rand/v2"
	"time"

	"tarnlight/eem"
)

// Bottle is one row of a run sheet and the liquid behind it.
type Bottle struct {
	ID   string // letters, digits, '-', '.', '_': it names the files
	Kind string // sample, blank, field-blank, standard, control, spike
	Site string

	Liquid   Liquid  // in the bottle
	Dilution float64 // of what was scanned; zero means 1

	Sampled, Measured    time.Time // the zero Time is not written
	Setup, Batch         string
	ReplicateOf, SpikeOf string
	Known                []Dose  // what the run sheet says: standards, controls, and what was added to a spike
	DOC                  float64 // mg/L, as the laboratory found it; 0 not determined
	TemperatureC         float64 // 0 not noted
	Remark               string

	Power        float64 // of the lamp for this bottle; zero means the instrument's
	Closed       bool    // measured with the shutter closed
	NoAbsorbance bool    // no absorbance was measured

	// Spoil changes the raw counts of a bottle before they are rounded: faults
	// of a detector, a person or a file. nil leaves them.
	Spoil  func(e *eem.EEM, rnd *rand.Rand)
	Layout Layout
}

// Survey is a survey whose truth is known. Its raw numbers depend on Seed and a
// bottle's ID alone: leaving a bottle out or turning it into another kind
// changes no other one.
type Survey struct {
	Title      string
	Seed       uint64
	Instrument *Instrument
	Setups     map[string]*Instrument // of the bottles whose Setup names one
	Photometer *Photometer
	Components []*Fluorophore // that the run sheet knows, in the order of its columns
	Bottles    []Bottle
	Settings   string // further lines of survey.toml
	Planted    []Fault
}

// Fault is something wrong with a bottle that a run must notice.
type Fault struct {
	ID    string
	Test  string // code of eem.Tests that must be raised
	Words string
}

// TruthRow is how much of a component a bottle holds, before dilution.
type TruthRow struct {
	ID, Component string
	Value         float64
	Unit          string
}

// Faults returns the planted faults.
func (s *Survey) Faults() []Fault { return s.Planted }

// Truth lists samples, field blanks, controls and spikes in the order of the
// sheet, with every component that the sheet knows. A spike holds what was there
// and what was added.
func (s *Survey) Truth() []TruthRow {
	var rows []TruthRow
	for _, b := range s.Bottles {
		if b.Kind == "blank" || b.Kind == "standard" {
			continue
		}
		for _, f := range s.Components {
			rows = append(rows, TruthRow{b.ID, f.Name, b.Liquid.Amount(f), f.Unit})
		}
	}
	return rows
}

// Raw measures bottle i: raw counts to 0.1 and absorbance to 1e-5, the very
// numbers that the files hold, both of the liquid as diluted. The absorbance is
// nil where none was measured.
func (s *Survey) Raw(i int) (*eem.EEM, *eem.Absorbance) {
	b := s.Bottles[i]
	rnd := s.generator(b.ID)
	in := *s.instrument(b)
	in.Closed = in.Closed || b.Closed
	if b.Power != 0 {
		in.Power = b.Power
	}
	l := b.Liquid
	if b.Dilution > 1 {
		l = l.Diluted(b.Dilution)
	}
	e := in.Scan(l, rnd)
	if b.Spoil != nil {
		b.Spoil(e, rnd)
	}
	roundTo(e.F, 10)
	if b.NoAbsorbance {
		return e, nil
	}
	a := s.Photometer.Scan(l, rnd)
	roundTo(a.A, 1e5)
	return e, a
}

// instrument returns what measured a bottle. It panics when the bottle's Setup
// is not in Setups.
func (s *Survey) instrument(b Bottle) *Instrument {
	if b.Setup == "" {
		return s.Instrument
	}
	in, ok := s.Setups[b.Setup]
	if !ok {
		panic(fmt.Sprintf("synth: bottle %s has setup %q, which the survey lacks", b.ID, b.Setup))
	}
	return in
}

func (s *Survey) generator(id string) *rand.Rand {
	h := fnv.New64a()
	h.Write([]byte(id))
	return rand.New(rand.NewPCG(s.Seed, h.Sum64()))
}

// roundTo rounds to 1/per, to the very number that its decimal form is read as.
func roundTo(v []float64, per float64) {
	for i := range v {
		v[i] = math.Round(v[i]*per)/per + 0 // + 0: no negative zero
	}
}
