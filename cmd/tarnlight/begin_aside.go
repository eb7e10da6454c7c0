package main

import (
	"cmp"
	"fmt"
	"path"
	"regexp"
	"slices"
	"strings"
	"unicode"

	"tarnlight/eem"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// What begin cannot place is set aside: it gets a row with the reason under exclude.
// So it is told once, stands where people look, takes part in nothing, and becomes a
// bottle when somebody corrects its row.

// misfit is a scan whose name gives no row, and why.
type misfit struct {
	f   *found
	why string
}

// What ends the reason under exclude.
const (
	remedy     = "; correct this row and empty this cell to use it"
	concRemedy = "; write it into a column conc:NAME [unit] and empty this cell to use it"
)

// reason is what stands under exclude.
func (d *drafted) reason() string {
	switch {
	case d.aside == "" || d.misnamed:
		return d.aside
	case d.unknownConc:
		return d.aside + concRemedy
	}
	return d.aside + remedy
}

// papers are endings of what is kept beside scans and never one, whatever its name.
var papers = map[string]bool{".bmp": true, ".doc": true, ".docx": true, ".gif": true, ".heic": true, ".jpeg": true, ".jpg": true, ".md": true,
	".odt": true, ".pdf": true, ".png": true, ".ppt": true, ".pptx": true, ".rtf": true, ".tif": true, ".tiff": true}

// unreadable are the files that a telling pattern fits and nobody can read: somebody
// measured a bottle. What lies beside a scan of the same name in another form is one
// more copy of it.
func (b *beginning) unreadable(files []found, w *naming) []misfit {
	if w.pattern == nil || !slices.ContainsFunc([]string{"date", "kind", "n", "dilution", "nm"}, w.pattern.Has) {
		return nil // {id} fits everything
	}
	for i := range files {
		if f := &files[i]; f.guess.Content == scanfile.ScanContent {
			b.scans[strings.TrimSuffix(f.path, endingOf(f.path))] = true
		}
	}
	var out []misfit
	for i := range files {
		f := files[i]
		ending := endingOf(f.path)
		if c := f.guess.Content; c != scanfile.Unknown && c != scanfile.WorkbookContent || b.told[f.path] || papers[strings.ToLower(ending)] {
			continue
		}
		why, note := b.leftWhy(&f, nil), f.guess.Content == scanfile.Unknown && !f.guess.NoText
		f.guess = scanfile.Guess{Content: scanfile.ScanContent}
		if w.fits(&f, note) && !b.scans[strings.TrimSuffix(f.path, ending)] {
			out = append(out, misfit{&f, why})
			b.told[f.path] = true
		}
	}
	return out
}

// fits says whether a name follows the pattern; that of a text without numbers, which
// may be a note, must do so with a known kind or an excitation.
func (w *naming) fits(f *found, note bool) bool {
	_, ok := w.match(f)
	if ok && note && !w.pattern.Has("nm") {
		_, why := w.of(f)
		return why == "" && w.pattern.Has("kind")
	}
	return ok
}

// asideOf makes bottles of misfits by their bare names, as begin does without a
// pattern.
func (b *beginning) asideOf(list []misfit, stems map[string]string) []*drafted {
	w := &naming{kinds: b.set.Sheet.Kinds, stems: stems}
	at := map[string]*drafted{}
	var out []*drafted
	for _, m := range list {
		n, stem, _ := b.nameOf(m.f, w)
		n.id = plainID(cmp.Or(n.id, strings.ReplaceAll(m.f.path, "/", "-")))
		key := path.Dir(m.f.path) + "\x00" + n.key()
		if !m.f.single() {
			key = m.f.path
		}
		d := at[key]
		if d == nil {
			d = &drafted{named: n, dir: path.Dir(m.f.path), stem: stem, first: n.id, aside: m.why}
			at[key] = d
			out = append(out, d)
		}
		d.take(m.f)
	}
	return out
}

// plainID leaves out of a name what no id can hold.
func plainID(name string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || r == unicode.ReplacementChar {
			return -1
		}
		return r
	}, strings.TrimLeft(name, formulaMarks))
}

// countedID is what unused and free put behind an id that is taken.
var countedID = regexp.MustCompile(`^\(\d+\)$`)

// knownSample says whether one of the rows of a file stands for a sample of it: it
// has its name, or it was set aside because another bottle has that.
func knownSample(s string, f *found) bool {
	dir := path.Dir(f.path)
	return slices.ContainsFunc(f.rows, func(row *survey.Row) bool {
		if survey.FoldID(row.ID) == survey.FoldID(s) {
			return true
		}
		behind, ok := strings.CutPrefix(row.ID, s+" ")
		return ok && row.Exclude != "" && (countedID.MatchString(behind) || behind == row.Measured.Day() ||
			behind == path.Base(dir) || behind == strings.ReplaceAll(dir, "/", "-"))
	})
}

// tellAside says what was set aside. Where the sheet has no column for the reason
// those bottles are left out, and told again the next time.
func (b *beginning) tellAside(list []*drafted, sheet *survey.Sheet) []*drafted {
	can := len(sheet.Columns) == 0 || slices.ContainsFunc(sheet.Columns, func(c string) bool { return strings.EqualFold(c, "exclude") })
	var out []*drafted
	var ids []string
	for _, d := range list {
		if d.aside == "" {
			out = append(out, d)
			continue
		}
		b.leaveOpen(d.name(), "%s", d.aside)
		ids = append(ids, d.id)
		if can {
			out = append(out, d)
		}
	}
	slices.SortStableFunc(out, func(x, y *drafted) int { return cmp.Compare(x.last(), y.last()) })
	switch {
	case len(ids) == 0:
	case can:
		fmt.Fprintf(b.bar, "set aside, with the reason under exclude: %s (%s); correct a row and empty that cell to use it, or leave it: it is not told again. What nobody wants in the sheet can be named as ignore under [sheet] in survey.toml\n",
			eem.Count(len(ids), "row"), some(ids))
	default:
		fmt.Fprintf(b.bar, "%s left out and told again the next time; give the sheet a column exclude, where begin writes why, or name such files as ignore under [sheet] in survey.toml\n",
			eem.Count(len(ids), "bottle"))
	}
	return out
}

// name is the bottle's file, with the number of its fellows.
func (d *drafted) name() string {
	if len(d.files) == 1 {
		return d.files[0]
	}
	return fmt.Sprintf("%s and %d more like it", d.files[0], len(d.files)-1)
}

// placed are the bottles that were not set aside.
func placed(list []*drafted) []*drafted {
	var out []*drafted
	for _, d := range list {
		if d.aside == "" {
			out = append(out, d)
		}
	}
	return out
}

// holding are the bottles whose row needs known concentrations.
func holding(list []*drafted) (ids []string) {
	for _, d := range list {
		switch d.kind {
		case survey.Standard, survey.Control, survey.Spike:
			ids = append(ids, d.id)
		}
	}
	return ids
}

// tellConc says whose concentrations must be filled in.
func (b *beginning) tellConc(list []*drafted) {
	if ids := holding(list); len(ids) > 0 {
		fmt.Fprintf(b.bar, "%s (%s): fill in what they hold: component and unit in the header %s, a column for each component, the numbers below it\n",
			needs(len(ids)), some(ids), survey.DraftConc)
	}
}

func needs(n int) string {
	if n == 1 {
		return "1 bottle needs known concentrations"
	}
	return fmt.Sprintf("%d bottles need known concentrations", n)
}

// asideNamesakes sets samples aside whose file has their name, but that cannot have
// it as their id: they could not be found in the file.
func asideNamesakes(list []*drafted) {
	for _, d := range list {
		if d.calls != "" && d.calls != d.id {
			d.aside = d.namesake()
		}
	}
}

func (d *drafted) namesake() string {
	return fmt.Sprintf("it holds a sample %s, and another bottle has that id; in the file, too, the sample needs one of its own", d.calls)
}
