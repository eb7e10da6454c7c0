package prepare

import (
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// The names of [scans] applied.
const (
	stepOffset    = "offset"
	stepSpectral  = "spectral"
	stepInner     = "inner-filter"
	stepBlank     = "blank"
	stepIntensity = "intensity"
	stepDilution  = "dilution"
	stepScatter   = "scatter"
)

// done says whether a step was done to the files before they came here.
func (b *Bottle) done(step string) bool { return slices.Contains(b.Setting.Scans.Applied, step) }

// ScanSettings maps the survey's words to those of the reader.
func ScanSettings(s survey.Scans) *scanfile.Settings {
	mark := map[string]string{"comma": ",", "semicolon": ";", "tab": "\t", "blank": " ", "point": "."}
	return &scanfile.Settings{Form: scanfile.Form(s.Form), Delimiter: mark[s.Delimiter], Decimal: mark[s.Decimal],
		Skip: s.Skip, Excitation: s.Excitation,
		Across: strings.TrimPrefix(s.Across, "auto")}
}

// read does everything to a bottle that needs the bottle alone, or takes over what
// it made of the same files before.
func (b *Bottle) read(s *Survey, files []string) {
	if b.Rejected {
		return
	}
	raw := &rawFiles{s: s}
	if s.cache == nil {
		b.readAnew(s, raw, files)
		return
	}
	inputs, name, ok := b.entry(s, raw, files)
	if ok && s.cache.load(name, s, b) {
		b.Files, b.scanFiles = inputs, inputs[:len(files):len(files)]
		return
	}
	before := len(b.said)
	b.readAnew(s, raw, files)
	if ok && !b.Rejected {
		s.cache.store(name, b, b.said[before:])
	}
}

// entry hashes the bottle's raw files and names its entry in the cache.
func (b *Bottle) entry(s *Survey, raw *rawFiles, files []string) (in []Input, name string, ok bool) {
	paths := files
	if b.Row.Absorbance != "" {
		paths = append(slices.Clip(files), b.absorbancePath(s))
	}
	if in, ok = raw.hold(paths); !ok {
		return nil, "", false
	}
	name, err := s.cache.name(s, b, in)
	return in, name, err == nil
}

// absorbancePath is where the absorbance file that the row names should be.
func (b *Bottle) absorbancePath(s *Survey) string {
	return filepath.Join(s.root(), filepath.FromSlash(b.Row.Absorbance))
}

// readAnew reads the raw files and corrects the scans up to the inner filter.
func (b *Bottle) readAnew(s *Survey, raw *rawFiles, files []string) {
	scans, ok := b.readScans(s, raw, files)
	if !ok {
		return
	}
	e, err := eem.FromScans(scans)
	if err != nil {
		test := "unreadable"
		var repeated *eem.RepeatedExError
		if errors.As(err, &repeated) {
			test = "excitation-repeated"
		}
		msg := err.Error()
		if b.strange != nil {
			msg += fmt.Sprintf("; or give the row the id of one of the samples that the file names (%s)", some(b.strange))
		}
		b.reject(s, test, msg)
		return
	}
	if e.Em.Len() < 2 {
		b.reject(s, "unreadable", fmt.Sprintf("%s: the emission axis has %d point; an EEM needs at least 2", s.short(files[0]), e.Em.Len()))
		return
	}
	s.tell(b, Steps[0], e)
	if !b.readAbsorbance(s, raw) {
		return
	}
	e, dead := b.faults(s, e)
	for _, n := range dead {
		b.flag(s, n)
	}
	b.raw = b.toInnerFilter(s, e)
	b.EEM = b.raw
	b.flagNotes(s, b.EEM)
}

// readScans reads the raw files. Findings of one kind are told once a bottle.
func (b *Bottle) readScans(s *Survey, raw *rawFiles, files []string) ([]eem.Scan, bool) {
	var scans []eem.Scan
	found := map[string]int{}
	var notes []eem.Note
	set := ScanSettings(b.Setting.Scans)
	for _, path := range files {
		data, in, err := raw.load(path)
		if err == nil {
			b.Files, b.scanFiles = append(b.Files, in), append(b.scanFiles, in)
			var f *scanfile.File
			if f, err = s.parse(path, in, data, set); err == nil {
				own, told := b.own(f)
				scans = append(scans, own...)
				for _, n := range told {
					key := n.Test + "\x00" + n.Msg
					if n.Test != "read-guess" {
						key = n.Test
					}
					if found[key]++; found[key] == 1 {
						notes = append(notes, n)
					}
				}
			}
		}
		if err != nil {
			b.reject(s, "unreadable", err.Error())
			return nil, false
		}
	}
	for _, n := range notes {
		if n.Test == "read-guess" {
			b.guesses = append(b.guesses, Guess{Text: n.Msg, Files: found[n.Test+"\x00"+n.Msg], First: n.File})
		} else if n.Test != "" {
			if more := found[n.Test] - 1; more > 0 {
				n.Msg += fmt.Sprintf(" (and in %s more of the bottle)", eem.Count(more, "file"))
			}
			b.flag(s, n)
		}
	}
	return scans, true
}

// readAbsorbance reads the absorbance and brings it to the liquid scanned and to
// the bottle. False: the file is named and cannot be used.
func (b *Bottle) readAbsorbance(s *Survey, raw *rawFiles) bool {
	if b.Row.Absorbance == "" {
		return true
	}
	data, in, err := raw.load(b.absorbancePath(s))
	var a *eem.Absorbance
	var notes []eem.Note
	if err == nil {
		set := ScanSettings(b.Setting.Scans)
		a, notes, err = scanfile.ReadAbsorbanceBytes(in.Path, data, &scanfile.Settings{Delimiter: set.Delimiter, Decimal: set.Decimal})
		if err != nil && (set.Delimiter != "" || set.Decimal != "") {
			// Stated for the scans; the spectrophotometer may write otherwise.
			a, notes, err = scanfile.ReadAbsorbanceBytes(in.Path, data, nil)
		}
	}
	if err != nil {
		b.reject(s, "unreadable", err.Error())
		return false
	}
	b.Files = append(b.Files, in)
	for _, n := range notes {
		if n.Test != "" && n.Test != "read-guess" {
			b.flag(s, n)
		}
	}
	a.PathCM = b.Row.AbsorbancePathCM
	b.Absorb = a.Times(b.Row.AbsorbanceDilution)
	b.scanned = a.Times(b.Row.AbsorbanceDilution / b.Row.Dilution)
	return true
}

// noLight says whether no light came through to the raw scans e.
func (b *Bottle) noLight(e *eem.EEM) (bool, string) { return correct.NoLight(e) }

// geometry of the measuring cell.
func geometry(c survey.Correct) correct.Geometry {
	return correct.Geometry{Form: c.InnerFilter, Ex: c.ExcitationWindowCM, Em: c.EmissionWindowCM,
		PathCM: c.CellCM, InDeg: c.IncidenceDeg, OutDeg: c.ObservationDeg}
}

// toInnerFilter does the steps from the detector to the inner filter.
func (b *Bottle) toInnerFilter(s *Survey, e *eem.EEM) *eem.EEM {
	set := b.Setting
	switch {
	case b.skips(stepOffset):
	case set.Scans.Offset.Auto:
		if counts, ok := correct.OffsetAuto(e); ok {
			e = correct.Offset(e, counts)
		}
	case set.Scans.Offset.Counts != 0:
		e = correct.Offset(e, set.Scans.Offset.Counts)
	}
	s.tell(b, correct.StepOffset, e)
	e = b.startNoise(s, e)
	if f := s.factors[b.Row.Setup]; !b.skips(stepSpectral) && (f.ex != nil || f.em != nil) {
		e = correct.Spectral(e, f.ex, f.em)
	}
	s.tell(b, correct.StepSpectral, e)
	e = b.linearRange(s, e)
	if !b.skips(stepInner) && set.Correct.InnerFilter != "none" && b.needsAbsorbance() && b.twofold == nil {
		limit := set.Correct.AbsorbanceLimit
		var factor []float64
		g := geometry(set.Correct)
		if b.scanned != nil && b.Row.Kind == survey.Standard {
			e = correct.DropOverAbsorbing(e, b.scanned, g, limit)
		}
		e, factor = correct.InnerFilter(e, b.scanned, g, limit)
		b.Largest = largest(factor)
	}
	s.tell(b, correct.StepInner, e)
	return b.takeGain(e)
}

// flagNotes turns the findings among the notes of e that were not told before into
// flags. Steps only ever append notes.
func (b *Bottle) flagNotes(s *Survey, e *eem.EEM) {
	for _, n := range e.Notes[min(b.told, len(e.Notes)):] {
		if n.Test != "" {
			b.flag(s, n)
		}
	}
	b.told = len(e.Notes)
}

// needsAbsorbance is false for pure water, which absorbs nothing, unless an
// absorbance was measured all the same.
func (b *Bottle) needsAbsorbance() bool {
	return b.Row.Kind != survey.Blank && b.Row.Kind != survey.FieldBlank || b.scanned != nil
}

func largest(v []float64) float64 {
	m := nan
	for _, x := range v {
		if x == x && !(x <= m) {
			m = x
		}
	}
	return m
}

// gatherGuesses counts over the survey how files were taken.
func (s *Survey) gatherGuesses() {
	at := map[string]int{}
	for _, b := range s.Bottles {
		for _, g := range b.guesses {
			i, ok := at[g.Text]
			if !ok {
				i = len(s.Guesses)
				at[g.Text] = i
				s.Guesses = append(s.Guesses, Guess{Text: g.Text, First: g.First})
			}
			s.Guesses[i].Files += g.Files
		}
	}
	slices.SortStableFunc(s.Guesses, func(a, b Guess) int {
		if a.Files != b.Files {
			return b.Files - a.Files
		}
		return strings.Compare(a.Text, b.Text)
	})
}
