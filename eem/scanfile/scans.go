package scanfile

import (
	"bytes"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
)

// scans makes scans of the blocks: in the given form, or the one that fits.
func (r *reader) scans(form Form) error {
	byName := form == Auto || form == Long
	if byName && (len(r.rows.blocks) != 1 || len(r.rows.tail) > 0) {
		if l, ok := r.longText(); ok && l.label >= 0 {
			return r.named(l)
		}
	}
	if err := r.mainBlocks(); err != nil {
		return err
	}
	if byName {
		if l, ok := r.longHeader(); ok {
			return r.named(l)
		}
	}
	if len(r.main) == 0 {
		return errorf(r.name, 0, "holds no rows of numbers; check that this is the right file, or set scans.delimiter and scans.decimal")
	}
	r.file.HeaderLines = r.main[0].first - 1
	r.file.FooterLines = r.rows.total - r.main[len(r.main)-1].last
	for i := range r.main {
		r.over += r.main[i].over
	}
	if form == Auto {
		form = r.form(&r.main[0])
	}
	r.file.Form = form
	switch form {
	case Grid:
		return r.grids()
	case Long:
		return r.longByShape()
	}
	return r.stacks()
}

// form decides the form of a file from its first block.
func (r *reader) form(b *block) Form {
	cols := r.usedCols(b)
	_, gridHead := r.gridHead(b)
	switch {
	case cols == 2 && gridHead:
		if _, _, ok := r.excitation(b, true); !ok {
			return Grid // of one excitation, in the header row
		}
		return Stack
	case gridHead:
		return Grid
	case cols == 3 && r.longShape(b) != nil:
		return Long
	}
	return Stack
}

// lineEx finds the excitation in a header line.
func (r *reader) lineEx(line []byte) (float64, bool) {
	line = line[:min(len(line), 1000)]
	if r.pat != nil {
		return r.pat.nm(string(line))
	}
	if !mayMention(line) {
		return 0, false
	}
	return mentionedEx(string(line))
}

// mayMention is a cheap test before the expression of mentionedEx.
func mayMention(b []byte) bool {
	for i := 0; i+1 < len(b); i++ {
		switch b[i] | 0x20 {
		case 'e':
			if c := b[i+1] | 0x20; c == 'x' || c == 'c' { // excitation, eccitazione
				return true
			}
		case 'a':
			if b[i+1]|0x20 == 'n' { // Anregung
				return true
			}
		}
	}
	return false
}

// excitation finds the excitation of a block of one scan: a pattern of the
// settings in the file name, then in the lines above; without one by the word in
// the lines above, then in the file name (where the file holds one scan only).
// Two that differ are none, and the error says so.
func (r *reader) excitation(b *block, only bool) (nm float64, from string, ok bool) {
	inHeader := func() (float64, bool) {
		for i := range b.gap {
			if v, ok := r.lineEx(b.gap[i].text); ok {
				return v, true
			}
		}
		return 0, false
	}
	if r.pat != nil {
		if only {
			if v, ok := r.pat.nm(lastElements(strings.ReplaceAll(r.name, `\`, "/"), 1)); ok {
				return v, "the file name", true
			}
		}
		v, ok := inHeader()
		return v, "the header", ok
	}
	if v, ok := inHeader(); ok {
		return v, "the header", true
	}
	if only {
		v, ok := nameEx(r.name)
		return v, "the file name", ok
	}
	return 0, "", false
}

// sample returns the name of the sample that the lines above a block give.
func (b *block) sample() string {
	for _, t := range b.gap {
		if m := sampleLine.FindSubmatch(t.text[:min(len(t.text), 300)]); m != nil {
			if s := strings.TrimSpace(string(m[1])); s != "" {
				return s
			}
		}
	}
	return ""
}

// stacks reads blocks of one scan, or of scans side by side.
func (r *reader) stacks() error {
	r.how = "a stack: one emission scan a file"
	if len(r.main) > 1 {
		r.how = "a stack: emission scans one below the other"
	}
	for i := range r.main {
		b := &r.main[i]
		cols := r.usedCols(b)
		var err error
		switch {
		case cols == 2:
			err = r.oneScan(b, i)
		case cols > 2 && r.pairShape(b, cols):
			err = r.pairs(b, i, cols)
		case cols > 2:
			err = r.columns(b, i, cols)
		default:
			err = errorf(r.name, b.first, "one column of numbers; a scan has two, wavelength and intensity: set scans.delimiter and scans.decimal")
		}
		if err != nil {
			return err
		}
	}
	return nil
}

// blockEx returns the excitation of block i as a whole: its own, or where the
// blocks have none the one of the file.
func (r *reader) blockEx(i int) (float64, error) {
	b := &r.main[i]
	nm, from, ok := r.excitation(b, len(r.main) == 1)
	if !ok && len(r.main) > 1 {
		nm, from, ok = r.fileEx()
	}
	if !ok {
		return 0, r.noExcitation(b)
	}
	if nm > wavenumberAbove {
		nm = nmPerInvCM / nm
	}
	if nm < lowestNM || nm > highestNM {
		return 0, errorf(r.name, b.first, "excitation %g nm (from %s) is no wavelength of a fluorometer; set scans.excitation", nm, from)
	}
	if from == "the header" && r.pat == nil && len(r.main) == 1 {
		if other, ok := nameEx(r.name); ok && math.Abs(other-nm) > 1 {
			return 0, errorf(r.name, b.first, `the header says excitation %g nm, the file name %g nm; repair one of them, or set scans.excitation, for example "_ex{nm}"`, nm, other)
		}
	}
	r.exFrom = from
	return nm, nil
}

// fileEx returns the excitation that the head of a file or its name gives for all
// its blocks, when no later block gives its own.
func (r *reader) fileEx() (float64, string, bool) {
	for i := 1; i < len(r.main); i++ {
		if _, _, own := r.excitation(&r.main[i], false); own {
			return 0, "", false
		}
	}
	return r.excitation(&r.main[0], true)
}

func (r *reader) noExcitation(b *block) error {
	if r.pat != nil {
		return errorf(r.name, b.first, "scans.excitation = %q matches neither the file name nor a line above these numbers; repair the pattern", r.set.Excitation)
	}
	return errorf(r.name, b.first, `no excitation for these numbers: neither a header line ("excitation: 240") nor the file name ("S1_ex240") gives one; set scans.excitation, for example "_ex{nm}"`)
}

func (r *reader) oneScan(b *block, i int) error {
	ex, err := r.blockEx(i)
	if err != nil {
		return err
	}
	sample := ""
	if len(r.main) > 1 {
		sample = b.sample()
	}
	return r.scanOf(b, 0, 1, ex, sample)
}

// scanOf adds the scan of two columns of a block. Rows that lack both, where
// scans of unequal length stand side by side, are left out.
func (r *reader) scanOf(b *block, emCol, fCol int, ex float64, sample string) error {
	em, f := slices.Grow(r.store.em[:0], b.rows), make([]float64, 0, b.rows)
	var at []int // rows of the block, where some are left out
	for i := range b.rows {
		row := r.rowCells(b, i)
		e, v := row[emCol], row[fCol]
		if e != e && v != v {
			if at == nil {
				at = make([]int, len(em), b.rows)
				for k := range at {
					at[k] = k
				}
			}
			continue
		}
		if at != nil {
			at = append(at, i)
		}
		em, f = append(em, e), append(f, v)
	}
	line := func(k int) int {
		if at != nil {
			if k >= len(at) {
				return b.first
			}
			k = at[k]
		}
		return r.line(b, k)
	}
	r.store.em = em // an axis is a copy
	r.toNM(em, r.saysWavenumber(b, emCol))
	axis, o, err := r.axis(em, line)
	if err != nil {
		return err
	}
	r.add(eem.Scan{Ex: ex, Em: axis, F: o.apply(f), Line: line(0)}, sample)
	return nil
}

// saysWavenumber looks for the unit 1/cm in the header of a column.
func (r *reader) saysWavenumber(b *block, col int) bool {
	for t := range b.headers {
		if !bytes.Contains(t.text, []byte("cm")) && !bytes.ContainsAny(t.text, "wW") {
			continue
		}
		if f := r.header(t); len(f) > col && wavenumberWord.Match(f[col]) {
			return true
		}
	}
	return false
}
