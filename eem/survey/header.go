package survey

import (
	"strings"
	"unicode/utf8"

	"tarnlight/eem"
)

// header finds the columns. It returns false when rows cannot be read without
// those that are missing.
func (r *sheetReader) header() bool {
	seen := make(map[string]string)
	n := r.width()
	for i, name := range r.t.Header[:n] {
		name = strings.TrimSpace(name)
		h := headed{}
		switch c, ok := columnOf(name); {
		case name == "":
			r.add(r.t.HeadLine, "", "column %d has cells and no name; name it, or empty its cells", i+1)
		case ok:
			h.known = &c
		case isConc(name):
			c, msg := concOf(name)
			if msg != "" {
				r.add(r.t.HeadLine, name, "%s", msg)
			}
			h.conc = &c
		default:
			if msg := controls(name); msg != "" {
				r.add(r.t.HeadLine, name, "the column's name %s", msg)
			}
		}
		if id := h.identity(name); name != "" {
			if other, twice := seen[id]; twice {
				r.add(r.t.HeadLine, name, "the column stands twice (%s and %s); rename or remove one", quote(other), quote(name))
			}
			seen[id] = name
		}
		r.cols = append(r.cols, h)
		r.sheet.Columns = append(r.sheet.Columns, name)
	}
	r.likeKnown(seen)
	return r.neededColumns(seen)
}

// width is the number of columns without empty ones at the right end, which
// spreadsheets leave behind.
func (r *sheetReader) width() int {
	n := len(r.t.Header)
	for ; n > 0 && strings.TrimSpace(r.t.Header[n-1]) == ""; n-- {
		for i := range r.t.Rows {
			if cell(&r.t.Rows[i], n-1) != "" {
				return n
			}
		}
	}
	return n
}

// identity is what may stand once in a header: a known column, a component in any
// unit, or another name, case ignored.
func (h headed) identity(name string) string {
	if h.conc != nil {
		return "conc:" + foldID(h.conc.Name)
	}
	return foldID(name)
}

// neededColumns reports missing columns.
func (r *sheetReader) neededColumns(seen map[string]string) bool {
	ok := true
	for _, c := range columns {
		if _, there := seen[c.name]; c.needed && !there {
			near, found := nearest(c.name, r.sheet.Columns)
			if found {
				r.add(r.t.HeadLine, c.name, "the column is missing; is it the one named %s? the header needs id, kind and scans", quote(near))
			} else {
				r.add(r.t.HeadLine, c.name, "the column is missing; the header needs id, kind and scans, and the delimiter must be comma, semicolon or tab")
			}
			ok = false
		}
	}
	return ok
}

// likeKnown notes columns that are carried along and may have been meant for one
// that is known: a dilution that is misspelt is a result ten times too small.
func (r *sheetReader) likeKnown(seen map[string]string) {
	for i, h := range r.cols {
		name := r.sheet.Columns[i]
		if h.conc != nil && h.conc.Unit == "" {
			r.note("conc-unit", eem.Remark, r.t.HeadLine, "column %s gives no unit, so that results of %s stand in the unit \"unstated\"; write conc:%s [unit]", quote(name), quote(h.conc.Name), h.conc.Name)
		}
		if h.known != nil || h.conc != nil {
			continue
		}
		if strings.HasPrefix(strings.ToLower(name), "conc") {
			r.note("sheet-column", eem.Doubt, r.t.HeadLine, "column %s is only carried along; if it holds known concentrations, write it conc:NAME or conc:NAME [unit]", quote(name))
			continue
		}
		for _, c := range columns {
			if _, there := seen[c.name]; there || !alike(name, c.name) {
				continue
			}
			sev := eem.Doubt
			if c.name == "site" || c.name == "sampled" { // no number depends on them
				sev = eem.Remark
			}
			r.note("sheet-column", sev, r.t.HeadLine, "column %s is only carried along; if it was meant to be %s, rename it", quote(name), c.name)
		}
	}
}

// alike says whether a header is probably a slip of a known one: the same letters
// and digits, or one edit away from five, two from nine.
func alike(name, known string) bool {
	squeeze := func(s string) string {
		return strings.Map(func(r rune) rune {
			if strings.ContainsRune(" _-.", r) {
				return -1
			}
			return r
		}, strings.ToLower(s))
	}
	a, b := squeeze(name), squeeze(known)
	n := utf8.RuneCountInString(a)
	if n > 2*len(b)+2 {
		return false
	}
	switch d := edits(a, b); {
	case d == 0:
		return true
	case n >= 9:
		return d <= 2
	default:
		return n >= 5 && d <= 1
	}
}
