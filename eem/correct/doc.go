// Package correct turns detector counts into comparable fluorescence: detector
// limits and offset, spectral factors, inner filter, blank, intensity scale and
// dilution.
//
// Every step is one pure function: it takes an EEM, returns a new one and
// appends notes. One note without a test code is the record of the step with
// its parameters; each finding is a note of its own with the code of the test
// (eem.Tests), its value and its limit. The order of the steps is the caller's.
//
// A step multiplies variances and the shapes of shared causes along with the
// intensities. Causes that the step itself brings in are appended where their
// size is known.
package correct

import (
	"fmt"
	"math"
	"strconv"

	"tarnlight/eem"
)

// Names of the steps in the notes.
const (
	StepDetector   = "detector"
	StepNoise      = "noise"
	StepSaturation = "saturation"
	StepOffset     = "offset"
	StepSpectral   = "spectral factors"
	StepInner      = "inner filter"
	StepBlank      = "blank"
	StepScale      = "intensity scale"
	StepDilution   = "dilution"
)

// finding makes the note of a test. It panics on a code that is not on the list.
func finding(step, code string, value, limit float64, msg string) eem.Note {
	t, ok := eem.FindTest(code)
	if !ok {
		panic(fmt.Sprintf("correct: test code %q is not on the list", code))
	}
	return eem.Note{Step: step, Test: code, Severity: t.Severity, Value: value, Limit: limit, Measure: true, Msg: msg}
}

// record makes the plain record of a step.
func record(step, msg string, params ...eem.Param) eem.Note {
	return eem.Note{Step: step, Params: params, Msg: msg}
}

// defaultLimit returns limit, or the default of the test when limit is 0.
func defaultLimit(code string, limit float64) float64 {
	if limit != 0 {
		return limit
	}
	t, _ := eem.FindTest(code)
	return t.Limit
}

// num prints a number for a note: six significant digits tell what was done and
// do not change with the last bit.
func num(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }

// times multiplies cell i, its variance and the shapes of its causes by f. The
// shapes must belong to e alone (see own). A number beyond what a float64 holds
// is no intensity: the cell becomes missing (Saturated).
func times(e *eem.EEM, i int, f float64) {
	e.F[i] *= f
	if e.Var != nil {
		e.Var[i] *= f * f
	}
	for c := range e.Causes {
		if s := e.Causes[c].Shape; s != nil {
			s[i] *= f
		}
	}
	dropInf(e, i)
}

func dropInf(e *eem.EEM, i int) {
	if math.IsInf(e.F[i], 0) {
		e.Drop(i, eem.Saturated)
	}
}

// own returns a copy of e whose causes' shapes may be written to.
func own(e *eem.EEM) *eem.EEM {
	out := e.Clone()
	for c := range out.Causes {
		if s := out.Causes[c].Shape; s != nil {
			out.Causes[c].Shape = append([]float64(nil), s...)
		}
	}
	return out
}

// fix gives every relative cause its shape U·F as the cells stand now, before an
// operation that is no multiplication. The shapes are new.
func fix(e *eem.EEM) {
	for c := range e.Causes {
		if e.Causes[c].Shape != nil {
			continue
		}
		s := make([]float64, len(e.F))
		for i, v := range e.F {
			s[i] = e.Causes[c].U * v
		}
		e.Causes[c].Shape = s
	}
}

// measured says whether cell i holds a measured number.
func measured(e *eem.EEM, i int) bool { return e.Why[i] == eem.Measured && !math.IsNaN(e.F[i]) }
