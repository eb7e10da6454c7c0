package main

import (
	"cmp"
	"fmt"
	"path"
	"slices"
	"strings"
	"time"

	"golang.org/x/text/unicode/norm"

	"tarnlight/eem/prepare"
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
		n, stem, why := b.nameOf(f, w)
		if why != "" {
			misfits = append(misfits, misfit{f, why})
			continue
		}
		key := path.Dir(f.path) + "\x00" + n.key()
		if w.pattern == nil && !f.single() {
			key = f.path
		}
		d := at[key]
		if d == nil || !f.single() {
			if d != nil {
				misfits = append(misfits, misfit{f, fmt.Sprintf("%s is the same bottle by its name, but each holds a whole EEM", d.files[0])})
				continue
			}
			d = &drafted{named: n, dir: path.Dir(f.path), stem: stem, first: n.id}
			at[key] = d
			out = append(out, d)
		}
		d.take(f)
	}
	out = append(out, b.takeSpoilt(files, w, at)...)
	out = append(out, b.asideOf(misfits, w.stems)...)
	slices.SortStableFunc(out, func(x, y *drafted) int {
		return cmp.Or(cmp.Compare(x.last(), y.last()), strings.Compare(x.day, y.day), strings.Compare(x.id, y.id), cmp.Compare(x.order(), y.order()), strings.Compare(x.files[0], y.files[0]))
	})
	return out
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

// withCells gives the bottles their cells.
func (b *beginning) withCells(list []*drafted) []*drafted {
	out := list[:0]
	for _, d := range list {
		var ok bool
		if d.scans, ok = b.cell(d); !ok {
			b.leaveOpen(d.files[0], "no scans cell can name it and its %d fellows and nothing else; rename them, or give them a folder of their own", len(d.files)-1)
			continue
		}
		out = append(out, d)
	}
	return out
}

// cell writes the files of a bottle as a scans cell: the file, the folder that holds
// nothing else, or a pattern.
func (b *beginning) cell(d *drafted) (string, bool) {
	if len(d.files) == 1 {
		if survey.PlainCell(d.files[0]) {
			return d.files[0], true
		}
		return b.exact(survey.PatternOf(d.files[0]), d.files)
	}
	if d.dir != "." {
		for _, cell := range []string{d.dir, survey.PatternOf(d.dir)} {
			if got, ok := b.exact(cell, d.files); ok {
				return got, true
			}
		}
	}
	first, last := d.files[0], d.files[len(d.files)-1] // in order: what these share all do
	i := 0
	for i < min(len(first), len(last)) && first[i] == last[i] {
		i++
	}
	head := strings.TrimRight(strings.ToValidUTF8(first[:i], ""), "0123456789.,")
	return b.exact(survey.PatternOf(head)+"*"+survey.PatternOf(endingOf(first)), d.files)
}

// exact says whether a cell names these files and no other.
func (b *beginning) exact(cell string, files []string) (string, bool) {
	if !survey.PlainCell(cell) {
		return "", false
	}
	got, err := prepare.Expand(b.root, cell)
	if err != nil || len(got) != len(files) {
		return "", false
	}
	for i := range got {
		if b.rel(got[i]) != files[i] {
			return "", false
		}
	}
	return cell, true
}

// distinct gives every bottle an id that neither the sheet nor another bottle has:
// the name, with its number or word for a repetition; where that is taken by a
// bottle of another day or folder, with day or folder behind it. A bottle that has
// its row already is told and left out.
func (b *beginning) distinct(list []*drafted, sheet *survey.Sheet, claims prepare.Claimed) []*drafted {
	taken := map[string]*survey.Row{}
	for i := range sheet.Rows {
		taken[survey.FoldID(sheet.Rows[i].ID)] = &sheet.Rows[i]
	}
	places := map[*survey.Row]map[string]bool{} // folders of a row's files
	for file, rows := range claims {
		for _, row := range rows {
			if places[row] == nil {
				places[row] = map[string]bool{}
			}
			places[row][path.Dir(b.rel(file))] = true
		}
	}
	byDay := map[string]string{} // name and day → id
	var out []*drafted
	for _, d := range list {
		base := d.id
		switch {
		case d.n > 1:
			d.id = fmt.Sprintf("%s-%d", base, d.n)
		case d.repeats:
			d.id = base + "-dup"
		}
		id, late := b.free(d, taken, places)
		switch {
		case d.aside != "":
		case d.broken != "" && taken[survey.FoldID(d.id)] != nil:
			b.leaveOpen(d.name(), "%s; there is a bottle of its name (%s) already; export it again, remove it, or name it as ignore under [sheet] in survey.toml", d.broken, d.id)
			continue
		case late != nil:
			d.aside = fmt.Sprintf("by its name it belongs to %s, whose row (line %d) does not name it", late.ID, late.Line)
		case d.calls != "" && d.calls != id:
			d.aside = d.namesake()
		}
		if d.aside != "" {
			d.id = unusedID(d.id, taken)
			taken[survey.FoldID(d.id)] = &survey.Row{ID: d.id}
			out = append(out, d)
			continue
		}
		if d.broken != "" {
			b.leaveOpen(d.name(), "%s; its row is there, and it is read once it is whole", d.broken)
		}
		_, again := byDay[base+"\x00"+d.day]
		switch d.id = id; {
		case d.kind != survey.Sample:
		case d.n > 1 || d.repeats || again && d.dilution > 0: // also the same water at another dilution
			if first, ok := byDay[base+"\x00"+d.day]; ok {
				d.replicateOf = first
			} else if row := taken[survey.FoldID(base)]; row != nil && (d.day == "" || row.Measured.Day() == "" || row.Measured.Day() == d.day) {
				d.replicateOf = row.ID
			}
		default:
			byDay[base+"\x00"+d.day] = id
		}
		taken[survey.FoldID(id)] = &survey.Row{ID: id}
		out = append(out, d)
	}
	return out
}

// free finds an id that is not taken, or the row of the same bottle.
func (b *beginning) free(d *drafted, taken map[string]*survey.Row, places map[*survey.Row]map[string]bool) (id string, late *survey.Row) {
	tries := []string{d.id}
	if d.day != "" {
		tries = append(tries, d.id+" "+d.day)
	}
	if d.dir != "." {
		tries = append(tries, d.id+" "+path.Base(d.dir), d.id+" "+strings.ReplaceAll(d.dir, "/", "-"))
	}
	for _, id := range tries {
		row := taken[survey.FoldID(id)]
		if row == nil {
			return id, nil
		}
		if places[row][d.dir] && (d.day == "" || row.Measured.Day() == "" || row.Measured.Day() == d.day) {
			return "", row
		}
	}
	for n := 2; ; n++ {
		if id := fmt.Sprintf("%s (%d)", d.id, n); taken[survey.FoldID(id)] == nil {
			return id, nil
		}
	}
}

// byPath gives bottles of one name in different folders the folder's too, and names
// repetitions.
func byPath(list []*drafted) []*drafted {
	count := map[string]int{}
	for _, d := range list {
		if d.repeats {
			d.id += "-dup"
		}
		count[survey.FoldID(d.id)]++
	}
	for _, d := range list {
		if count[survey.FoldID(d.id)] > 1 || d.id == "" {
			d.id = strings.NewReplacer("/", "-", "*", "").Replace(strings.TrimSuffix(d.scans, endingOf(d.scans)))
		}
		d.id = strings.TrimLeft(d.id, formulaMarks)
	}
	taken := map[string]int{}
	for _, d := range list {
		l := survey.FoldID(d.id)
		if taken[l]++; taken[l] > 1 || l == "" {
			d.id = fmt.Sprintf("%s (%d)", d.id, taken[l])
		}
	}
	for _, d := range list {
		for _, x := range list {
			if d.repeats && d.kind == survey.Sample && !x.repeats && x.first == d.first && x.dir == d.dir {
				d.replicateOf = x.id
			}
		}
	}
	slices.SortFunc(list, func(a, b *drafted) int { return strings.Compare(a.id, b.id) })
	return list
}
