package eem

import (
	"errors"
	"fmt"
	"math"
	"sort"
)

// Scan is one emission scan as a file gave it: intensities F (counts, NaN
// missing) at the wavelengths Em, excited at Ex nm.
type Scan struct {
	Ex   float64
	Em   Axis
	F    []float64 // same length as Em
	File string    // where it came from, for messages
	Line int       // first line of numbers in File, from 1
}

// RepeatedExError says that one excitation was scanned twice with different
// numbers, so that nobody can know which scan counts.
type RepeatedExError struct {
	Ex   float64 // nm
	A, B Scan
}

// Error names both places.
func (e *RepeatedExError) Error() string {
	return fmt.Sprintf("%s:%d: excitation %g nm was scanned before in %s:%d with other numbers; remove one of the two",
		e.B.File, e.B.Line, e.Ex, e.A.File, e.A.Line)
}

// FromScans stacks scans into an EEM in counts. Excitations are sorted; emission
// axes of unequal length are joined, cells that a scan lacks are missing. Scans
// whose emission points interleave (the joined axis would have more than twice
// the points of the longest scan) are interpolated linearly onto the axis of
// the longest one, and a note says so. A scan given twice with the same numbers
// counts once; with other numbers it is a *RepeatedExError.
func FromScans(scans []Scan) (*EEM, error) {
	if len(scans) == 0 {
		return nil, errors.New("no emission scan was found")
	}
	s := make([]Scan, len(scans))
	copy(s, scans)
	sort.SliceStable(s, func(a, b int) bool { return s[a].Ex < s[b].Ex })
	s, err := dropRepeats(s)
	if err != nil {
		return nil, err
	}
	exs := make([]float64, len(s))
	longest := 0
	for i := range s {
		exs[i] = s[i].Ex
		if s[i].Em.Len() > s[longest].Em.Len() {
			longest = i
		}
	}
	ex, err := NewAxis(exs)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", s[0].File, err)
	}
	em := joinAxes(s)
	interleaved := em.Len() > 2*s[longest].Em.Len()
	if interleaved {
		em = s[longest].Em
	}
	e := New(Grid{Ex: ex, Em: em}, Counts)
	for j := range s {
		for k := range em.Len() {
			v := math.NaN()
			if i, ok := s[j].Em.Find(em.At(k)); ok {
				v = s[j].F[i]
			} else if interleaved {
				v = s[j].Em.Interp(s[j].F, em.At(k))
			}
			if !math.IsNaN(v) && !math.IsInf(v, 0) {
				i := e.Index(j, k)
				e.F[i], e.Why[i] = v, Measured
			}
		}
	}
	if interleaved {
		e.Note(Note{Step: "read", Severity: Information,
			Msg: "the scans' emission points interleave; all were interpolated onto the longest scan's axis, " + em.String()})
	}
	return e, nil
}

func dropRepeats(s []Scan) ([]Scan, error) {
	out := s[:0:0]
	for _, c := range s {
		if n := len(out); n > 0 && math.Abs(out[n-1].Ex-c.Ex) <= sameNM {
			if !sameScan(out[n-1], c) {
				return nil, &RepeatedExError{Ex: c.Ex, A: out[n-1], B: c}
			}
			continue
		}
		out = append(out, c)
	}
	return out, nil
}

func sameScan(a, b Scan) bool {
	if !a.Em.Equal(b.Em) {
		return false
	}
	for i, v := range a.F {
		if v != b.F[i] && !(math.IsNaN(v) && math.IsNaN(b.F[i])) {
			return false
		}
	}
	return true
}

// joinAxes returns every emission wavelength that any scan has.
func joinAxes(s []Scan) Axis {
	var all []float64
	for i, c := range s {
		if i > 0 && c.Em.Equal(s[i-1].Em) {
			continue
		}
		all = append(all, c.Em.nm...)
	}
	sort.Float64s(all)
	out := all[:0:0]
	for _, v := range all {
		if n := len(out); n == 0 || v-out[n-1] > sameNM {
			out = append(out, v)
		}
	}
	return Axis{nm: out}
}
