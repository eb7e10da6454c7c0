package prepare

import (
	"fmt"
	"slices"
	"strings"
	"sync"

	"tarnlight/eem"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// sharedFile is a raw file that several rows name: a day of samples, each of which
// the file calls by the id of its row.
type sharedFile struct {
	mu   sync.Mutex
	left int // rows that have not read it yet
	set  scanfile.Settings
	file *scanfile.File // parsed, until the last row has read it
}

// share finds the files that several rows name. It is an error when one of them
// does not name its samples by the ids of these rows.
func (s *Survey) share(files [][]string) error {
	owners := map[string][]*Bottle{}
	for i, b := range s.Bottles {
		for _, path := range files[i] {
			owners[path] = append(owners[path], b)
		}
	}
	s.shared = map[string]*sharedFile{}
	for i := range s.Bottles {
		for _, path := range files[i] {
			if list := owners[path]; len(list) > 1 && s.shared[path] == nil {
				if why, ok := s.samplesOf(path, list); !ok {
					return s.claimedTwice(path, list[0].Row, list[1].Row, why)
				}
				s.shared[path] = &sharedFile{left: len(list)}
			}
		}
	}
	return nil
}

// samplesOf says whether a file can hold all of these bottles, and what of its names
// keeps it from that where it has any.
func (s *Survey) samplesOf(path string, list []*Bottle) (why string, ok bool) {
	data, in, err := s.load(path)
	if err != nil {
		return "", false
	}
	f, err := scanfile.ReadBytes(in.Path, data, ScanSettings(list[0].Setting.Scans))
	if err != nil || len(f.Names()) < 2 {
		return "", false
	}
	for _, b := range list {
		if !slices.Contains(f.Names(), b.Row.ID) {
			return fmt.Sprintf("; it names samples (%s), but none %q", some(f.Names()), b.Row.ID), false
		}
	}
	return "", true
}

// claimedTwice is the error of a raw file that two rows name.
func (s *Survey) claimedTwice(path string, a, b *survey.Row, why string) error {
	return fmt.Errorf("%s:%d: raw file %s belongs to %q (line %d) and to %q (line %d)%s; make the scans cells more exact, for example %q instead of %q",
		s.Sheet.Path, b.Line, s.short(path), a.ID, a.Line, b.ID, b.Line, why, exacter(a.Scans), a.Scans)
}

// some lists the first few names.
func some(names []string) string {
	if len(names) > 5 {
		return strings.Join(names[:5], ", ") + ", …"
	}
	return strings.Join(names, ", ")
}

// parse reads the scans of a raw file; one that several rows name only once.
func (s *Survey) parse(path string, in Input, data []byte, set *scanfile.Settings) (*scanfile.File, error) {
	f := s.shared[path]
	if f == nil {
		return scanfile.ReadBytes(in.Path, data, set)
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	file := f.file
	if file == nil || f.set != *set {
		var err error
		if file, err = scanfile.ReadBytes(in.Path, data, set); err != nil {
			return nil, err
		}
		f.file, f.set = file, *set
	}
	if f.left--; f.left == 0 {
		f.file = nil
	}
	return file, nil
}

// own returns the scans of a file that belong to the bottle: where a file names
// several samples, those of the bottle's id. Cells past the detector's limit are
// then told only of bottles that lack cells.
func (b *Bottle) own(f *scanfile.File) ([]eem.Scan, []eem.Note) {
	names := f.Names()
	if len(names) < 2 {
		return f.Scans, f.Notes
	}
	if !slices.Contains(names, b.Row.ID) {
		b.strange = names
		return f.Scans, f.Notes
	}
	scans := f.Of(b.Row.ID)
	lacks := slices.ContainsFunc(scans, func(s eem.Scan) bool { return slices.ContainsFunc(s.F, func(v float64) bool { return v != v }) })
	var notes []eem.Note
	for _, n := range f.Notes {
		if n.Test != "saturated" || lacks {
			notes = append(notes, n)
		}
	}
	return scans, notes
}
