package prepare

import (
	"path/filepath"

	"tarnlight/eem"
)

// judge applies the survey's quality settings to a note: a doubt that the
// settings accept is only a note here, and the reason stands beside it.
func (s *Survey) judge(n eem.Note) eem.Note {
	if why, ok := s.Settings.Quality.Accept[n.Test]; ok && n.Severity == eem.Doubt {
		n.Severity = eem.Remark
		n.Msg += " (accepted: " + why + ")"
	}
	return n
}

// Accept applies the survey's quality settings to a flag raised elsewhere. It
// panics like eem.NewFlag.
func (s *Survey) Accept(f eem.Flag) eem.Flag {
	f = eem.NewFlag(f)
	n := s.judge(eem.Note{Test: f.Test, Severity: f.Severity, Msg: f.Msg})
	f.Severity, f.Msg = n.Severity, n.Msg
	return f
}

// Limit returns the limit of a test that is in force.
func (s *Survey) Limit(code string) float64 {
	if v, ok := s.Settings.Quality.Limit[code]; ok {
		return v
	}
	t, _ := eem.FindTest(code)
	return t.Limit
}

// flag records a note that a test raised.
func (b *Bottle) flag(s *Survey, n eem.Note) {
	b.said = append(b.said, n)
	n = s.judge(n)
	if n.File == "" {
		n.File, n.Line = filepath.ToSlash(filepath.Base(s.Sheet.Path)), b.Row.Line
	}
	b.Flags = append(b.Flags, eem.FlagFrom(n, b.Row.ID, b.Batch))
	if n.Severity == eem.Reject {
		b.Rejected = true
	}
}

// tell hands a step's outcome to whoever traces it.
func (s *Survey) tell(b *Bottle, step string, e *eem.EEM) {
	if s.trace != nil {
		s.trace(b, step, e)
	}
}

// reject marks the bottle as unusable.
func (b *Bottle) reject(s *Survey, test, msg string) {
	b.flag(s, eem.Note{Test: test, Severity: eem.Reject, Msg: msg})
}

// collect gathers what the bottles noted.
func (s *Survey) collect() {
	for _, b := range s.Bottles {
		s.Flags = append(s.Flags, b.Flags...)
		s.Inputs = append(s.Inputs, b.Files...)
	}
	s.Inputs = uniqueInputs(s.Inputs)
}
