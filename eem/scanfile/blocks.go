package scanfile

import (
	"bytes"
	"math"
)

// mainBlocks finds the blocks that hold scans: those of two rows or more and not
// much shorter than the longest. A damaged row between or beside them is an
// error; free text inside one scan joins its halves.
func (r *reader) mainBlocks() error {
	all := make([]block, 0, len(r.rows.blocks))
	longest := 0
	for i := range r.rows.blocks {
		b := r.rows.blocks[i]
		if err := r.ragged(i); err != nil {
			return err
		}
		if n := len(all); n > 0 {
			joined, err := r.between(&all[n-1], &b)
			if err != nil {
				return err
			}
			if joined {
				longest = max(longest, all[n-1].rows)
				continue
			}
		}
		all = append(all, b)
		longest = max(longest, b.rows)
	}
	var gap []textLine // above the next main block
	r.main = all[:0]   // never ahead of i
	for i, b := range all {
		if i > 0 && len(b.gap) == 0 && all[i-1].rows == 1 {
			b.above = r.rowCells(&all[i-1], 0)
		}
		gap = append(gap, b.gap...)
		if b.rows < min(2, longest) || b.rows < longest/10 {
			continue
		}
		b.gap = gap
		r.main = append(r.main, b)
		gap = nil
	}
	if err := r.cutOff(); err != nil {
		return err
	}
	return r.edges()
}

// ragged refuses block i when it follows the rows of another directly, with
// another number of columns.
func (r *reader) ragged(i int) error {
	if i == 0 || len(r.rows.blocks[i].gap) > 0 {
		return nil
	}
	a, b := &r.rows.blocks[i-1], &r.rows.blocks[i]
	if a.rows < 2 {
		return nil // a header row
	}
	if b.first == r.rows.total && b.cols < a.cols {
		return errorf(r.name, b.first, "%d columns where the rows above have %d, and nothing follows; was the file cut short? Export it again", b.cols, a.cols)
	}
	return errorf(r.name, b.first, "%d columns where the rows above have %d; repair the line, or leave the top of the file out with scans.skip", b.cols, a.cols)
}

// between looks at the text between two blocks. It is an error when a line of it
// is a row with a cell that is no number; joined when b goes on where a ends.
func (r *reader) between(a, b *block) (joined bool, err error) {
	if a.cols != b.cols {
		return false, nil
	}
	end, start := r.rowCells(a, a.rows-1)[0], r.rowCells(b, 0)[0]
	goesOn := a.rows > 1 && continues(r.rowCells(a, a.rows-2)[0], end, start) ||
		b.rows > 1 && continues(r.rowCells(b, 1)[0], start, end)
	long := a.rows > 1 && b.rows > 1
	for _, t := range b.gap {
		f := splitFields(t.text, r.rows.delim)
		bad, numbers := -1, 0
		for i, c := range f {
			if _, ok := parseNumber(c, r.rows.dec); ok {
				numbers++
			} else if missing(c) == present && bad < 0 {
				bad = i
			}
		}
		switch {
		case len(f) != a.cols || bad < 0 || numbers == 0:
		case goesOn, r.lies(f[0], end, start), bad > 0 && long && len(f) > 2 && numbers == len(f)-1:
			return false, r.badCell(t.no, f[bad])
		}
	}
	if !goesOn {
		return false, nil
	}
	for _, t := range b.gap {
		if _, ok := r.lineEx(t.text); ok {
			return false, nil
		}
	}
	// Only rows of text lie between: in the store the cells are neighbours.
	if a.cell+a.rows*a.cols != b.cell {
		return false, nil
	}
	a.rows += b.rows
	a.over += b.over
	a.last = b.last
	return true, nil
}

// lies says whether a cell is a number between two others.
func (r *reader) lies(cell []byte, a, b float64) bool {
	v, ok := parseNumber(cell, r.rows.dec)
	return ok && (v-a)*(b-v) > 0
}

// edges refuses a text line directly above the first or below the last block that
// carries on its wavelengths: a row with text in it, or cut short.
func (r *reader) edges() error {
	if len(r.main) == 0 {
		return nil
	}
	a, z := &r.main[0], &r.main[len(r.main)-1]
	if n := len(a.gap); n > 0 && a.rows >= 2 {
		if err := r.edge(a.gap[n-1], r.rowCells(a, 1)[0], r.rowCells(a, 0)[0], a.cols); err != nil {
			return err
		}
	}
	if len(r.rows.tail) > 0 && z.rows >= 2 && z.last == r.rows.blocks[len(r.rows.blocks)-1].last {
		return r.edge(r.rows.tail[0], r.rowCells(z, z.rows-2)[0], r.rowCells(z, z.rows-1)[0], z.cols)
	}
	return nil
}

func (r *reader) edge(t textLine, before, last float64, cols int) error {
	f := splitFields(t.text, r.rows.delim)
	v, ok := parseNumber(f[0], r.rows.dec)
	if !ok || !continues(before, last, v) {
		return nil
	}
	if len(f) != cols {
		return errorf(r.name, t.no, "%d columns where the other rows have %d; was the file cut short? Export it again", len(f), cols)
	}
	for _, c := range f {
		if _, ok := parseNumber(c, r.rows.dec); !ok && missing(c) == present {
			return r.badCell(t.no, c)
		}
	}
	return nil
}

func (r *reader) badCell(line int, cell []byte) error {
	return errorf(r.name, line, "%q is not a number; leave the cell blank where nothing was measured, or set scans.delimiter and scans.decimal", clip(cell))
}

// clip shortens a text of the file for a message.
func clip(b []byte) string {
	if len(b) > 40 {
		return string(bytes.ToValidUTF8(b[:37], nil)) + "…"
	}
	return string(b)
}

// usedCols counts the columns without those at the right end that hold nothing:
// what a delimiter at the end of every line makes.
func (r *reader) usedCols(b *block) int {
	for c := b.cols; c > 1; c-- {
		for i := range b.rows {
			if !math.IsNaN(r.rows.cells[b.cell+i*b.cols+c-1]) {
				return c
			}
		}
	}
	return 1
}

// header returns the fields of a header line, those at the right end that are
// empty left out.
func (r *reader) header(t textLine) [][]byte {
	f := splitFields(t.text, r.rows.delim)
	for len(f) > 0 && len(f[len(f)-1]) == 0 {
		f = f[:len(f)-1]
	}
	return f
}

// maxHeaderRows is how many lines above the numbers may hold the column headers.
const maxHeaderRows = 8

// headers yields the lines above a block, from the lowest up.
func (b *block) headers(yield func(textLine) bool) {
	for i := len(b.gap) - 1; i >= max(0, len(b.gap)-maxHeaderRows); i-- {
		if !yield(b.gap[i]) {
			return
		}
	}
}
