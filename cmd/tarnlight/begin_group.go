package main

import (
	"cmp"
	"fmt"
	"path"
	"slices"
	"strings"
	"time"

	"golang.org/x/text/unicode/norm"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// drafted is a bottle that begin puts together.
type drafted struct {
	named
	dir         string // of its files, relative to the root
	stem        string // name of its files without excitation and ending
	calls       string // name that a file of several samples has for it, which must be its id; else empty
	first       string // the id that its name gives, without what was put behind it
	files       []string
	youngest    time.Time
	scans       string // cells of the run sheet
	absorbance  string
	replicateOf string
	aside       string // why it is set aside; empty: it is not
	unknownConc bool   // because its row needs concentrations
	misnamed    bool   // because a file must be renamed; correcting the row is no remedy
	broken      string // what is wrong with the one file that it has by name alone
}

// group puts files together: by the pattern where there is one, else a file that
// holds a whole EEM is a bottle, and single scans of one folder that share the name
// before the excitation are one. A file that names its samples is one bottle each.
func (b *beginning) group(files []found) []*drafted {
	w := &naming{kinds: b.set.Sheet.Kinds, stems: stemsOf(files)}
	if b.name != "" {
		w.pattern, _ = scanfile.CompilePattern(b.name) // run has compiled it before
	}
	var out []*drafted
	var misfits []misfit
	at := map[string]*drafted{}
	for i := range files {
		f := &files[i]
		if f.guess.Content != scanfile.ScanContent {
			continue
		}
		b.endings[strings.ToLower(endingOf(f.path))] = true
		if len(f.guess.Samples) > 1 {
			out = append(out, b.samplesOf(f, w)...)
			continue
		}
		d, why := b.bottleOf(f, w, at)
		if why != "" {
			misfits = append(misfits, misfit{f, why})
			continue
		}
		if d.files == nil {
			out = append(out, d)
		}
		d.take(f)
	}
	out = append(out, b.takeSpoilt(files, w, at)...)
	out = append(out, b.asideOf(append(misfits, b.unreadable(files, w)...), w.stems)...)
	slices.SortStableFunc(out, func(x, y *drafted) int {
		return cmp.Or(cmp.Compare(x.last(), y.last()), strings.Compare(x.day, y.day), strings.Compare(x.id, y.id), cmp.Compare(x.order(), y.order()), strings.Compare(x.files[0], y.files[0]))
	})
	return out
}

// bottleOf gives the bottle of a file by its name, a new one without files where it
// is the first of it; why says why it has none.
func (b *beginning) bottleOf(f *found, w *naming, at map[string]*drafted) (d *drafted, why string) {
	n, stem, why := b.nameOf(f, w)
	if why != "" {
		return nil, why
	}
	key := path.Dir(f.path) + "\x00" + n.key()
	if w.pattern == nil && !f.single() {
		key = f.path
	}
	switch d = at[key]; {
	case d == nil:
		d = &drafted{named: n, dir: path.Dir(f.path), stem: stem, first: n.id}
		at[key] = d
	case !f.single():
		return nil, fmt.Sprintf("%s is the same bottle by its name, but each holds a whole EEM", d.files[0])
	}
	return d, ""
}

// last puts what can be a bottle by name alone behind the others, and what is set
// aside behind all.
func (d *drafted) last() int {
	switch {
	case d.aside != "":
		return 2
	case d.broken != "":
		return 1
	}
	return 0
}

// takeSpoilt gives bottles the files that belong to their scans by name and are
// none by content, such as an empty one: they are rejected with a reason later on,
// and never lost from sight. One that has the name and the ending of a scan and no
// fellows is a bottle of its own, which is read once its file is whole.
func (b *beginning) takeSpoilt(files []found, w *naming, at map[string]*drafted) []*drafted {
	var out []*drafted
	for i := range files {
		f := files[i]
		if f.guess.Content != scanfile.Unknown {
			continue
		}
		wrong, noText := f.guess.Why, f.guess.NoText
		f.guess = scanfile.Guess{Content: scanfile.ScanContent}
		dir, base := path.Split(strings.TrimSuffix(f.path, endingOf(f.path)))
		if m := wavelengthTail.FindStringSubmatch(base); m != nil {
			w.stems[f.path] = dir + m[1]
		}
		n, stem, why := b.nameOf(&f, w)
		d := at[path.Dir(f.path)+"\x00"+n.key()]
		if d == nil && !saysExcitation.MatchString(base) { // its number may be one of a bottle
			delete(w.stems, f.path)
			n, stem, why = b.nameOf(&f, w)
		}
		if why != "" {
			continue
		}
		switch {
		case d != nil && (len(d.files) > 1 || d.broken != "") && endingOf(f.path) == endingOf(d.files[0]):
			d.take(&f)
			slices.Sort(d.files)
			b.told[f.path] = true
		case d == nil && w.pattern != nil && noText && b.endings[strings.ToLower(endingOf(f.path))]:
			d = &drafted{named: n, dir: path.Dir(f.path), stem: stem, first: n.id, broken: wrong}
			d.take(&f)
			at[path.Dir(f.path)+"\x00"+n.key()] = d
			out = append(out, d)
			b.told[f.path] = true
		}
	}
	return out
}

func (d *drafted) take(f *found) {
	d.files = append(d.files, f.path)
	if f.written.After(d.youngest) {
		d.youngest = f.written
	}
}

// nameOf reads a name by the pattern, or without one as it stands.
func (b *beginning) nameOf(f *found, w *naming) (n named, stem, why string) {
	stem = path.Base(strings.TrimSuffix(f.path, endingOf(f.path)))
	if s, ok := w.stems[f.path]; ok {
		_, stem = path.Split(s)
	}
	if w.pattern != nil {
		n, why = w.of(f)
		return n, stem, why
	}
	n.id = strings.TrimLeft(norm.NFC.String(strings.ToValidUTF8(stem, "_")), formulaMarks)
	n.kind = guessKind(n.id, w.kinds)
	if i := strings.LastIndexAny(n.id, separators); i > 0 && duplicateWords[strings.ToLower(n.id[i+1:])] {
		n.id, n.repeats = strings.TrimRight(n.id[:i], separators), true
	}
	return n, stem, ""
}

// folderNames gives bottles whose files fill a folder that folder's name, where
// their own says nothing: it is empty, or stands in other folders too.
func folderNames(list []*drafted, own map[string]survey.Kind) {
	dirs := map[string]map[string]bool{}
	for _, d := range list {
		if dirs[d.id] == nil {
			dirs[d.id] = map[string]bool{}
		}
		dirs[d.id][d.dir] = true
	}
	for _, d := range list {
		if d.scans == d.dir && (d.id == "" || len(dirs[d.id]) > 1) {
			d.id = path.Base(d.dir)
			d.first = d.id
			d.kind = guessKind(d.id, own)
		}
	}
}

// samplesOf makes a bottle of every sample that a file names.
func (b *beginning) samplesOf(f *found, w *naming) []*drafted {
	day := ""
	if w.pattern != nil {
		if got, ok := w.pattern.Match(f.path); ok {
			day = got["date"]
		}
	}
	var out []*drafted
	for _, s := range f.guess.Samples {
		if knownSample(s, f) {
			continue
		}
		d := &drafted{named: named{id: s, kind: guessKind(s, w.kinds), day: day}, dir: path.Dir(f.path), stem: s, first: s, calls: s}
		d.take(f)
		out = append(out, d)
	}
	return out
}
