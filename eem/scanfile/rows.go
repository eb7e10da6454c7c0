package scanfile

import (
	"bytes"
	"math"
)

// Bounds on what is kept of a file beside its numbers, so that a file of text or
// rubble costs no more memory than a few times its size.
const (
	maxGapLines = 2000   // text lines kept between two blocks of numbers
	maxBlocks   = 20_000 // blocks of numbers in one file
)

// textLine is a line that is no row of numbers.
type textLine struct {
	no   int
	text []byte
}

// block is a run of rows of numbers with one number of columns.
type block struct {
	gap         []textLine // the text above it, down from the block before
	first, last int        // lines
	cols, rows  int
	cell, row   int       // where its cells and its row lines begin
	over        int       // cells marked as past the detector's limit
	above       []float64 // a single row of numbers directly above, nil where there is none
}

// rowReader cuts a file into blocks of numbers and the text between them.
type rowReader struct {
	delim, dec byte
	skip       int
	cells      []float64 // all blocks, row-major, NaN missing
	lines      []int32   // the line of every row
	blocks     []block
	tail       []textLine // the text below the last block
	total      int        // lines of the file
	// A file whose rows hold text too (a sample's name) is read by column:
	// only want[i] columns are numbers, and in column label the place of the
	// text in labels stands for it.
	want   []bool
	label  int
	labels []string
	seen   map[string]int

	over int // of the row under way
}

func newRowReader(delim, dec byte, skip int) *rowReader {
	return &rowReader{delim: delim, dec: dec, skip: skip, label: -1}
}

// read cuts text. The error is without name.
func (r *rowReader) read(text []byte) *lineError {
	r.cells = make([]float64, 0, len(text)/6+8)
	r.lines = make([]int32, 0, len(text)/(16+len(text)/4096)+8)
	var gap []textLine
	open := false // the last block may go on
	for no := 1; len(text) > 0; no++ {
		var line []byte
		line, text = cutLine(text)
		r.total = no
		if no <= r.skip {
			continue
		}
		at := len(r.cells)
		switch n, kind := r.row(line, open); kind {
		case emptyRow:
		case wideRow:
			return &lineError{no, "more than 10,000 columns, which no scan has; check that this is the right file"}
		case numberRow:
			if !open || r.blocks[len(r.blocks)-1].cols != n {
				if len(r.blocks) == maxBlocks {
					return &lineError{no, "numbers and text alternate all through the file; is it a scan? Export it again as a table"}
				}
				r.blocks = append(r.blocks, block{gap: gap, first: no, cols: n, cell: at, row: len(r.lines)})
				gap, open = nil, true
			}
			b := &r.blocks[len(r.blocks)-1]
			b.last = no
			b.rows++
			b.over += r.over
			r.lines = append(r.lines, int32(no))
		case textRow:
			r.cells = r.cells[:at]
			open = false
			if len(gap) == maxGapLines { // keep the first and the last ones
				gap = append(gap[:maxGapLines/2], gap[maxGapLines*3/4:]...)
			}
			gap = append(gap, textLine{no, line})
		}
	}
	r.tail = gap
	return nil
}

// lineError is an error at a line of a file whose name the caller knows.
type lineError struct {
	line int
	msg  string
}

type rowKind uint8

const (
	textRow rowKind = iota
	emptyRow
	numberRow
	wideRow
)

// row appends the numbers of one line to cells. A row has two fields or more,
// each a number or missing, and one number at least. A lone number is a row of
// two, the second missing, where it goes on with the wavelengths of the rows
// above: editors cut the delimiter before a blank cell.
func (r *rowReader) row(line []byte, open bool) (n int, kind rowKind) {
	line = bytes.TrimRight(line, " ")
	if r.delim != '\t' {
		line = bytes.TrimRight(line, " \t")
	}
	if len(line) == 0 {
		return 0, emptyRow
	}
	r.over = 0
	quick := r.want == nil && r.delim != r.dec // a quoted decimal comma needs whole fields
	numbers, filled := 0, 0
	for more := true; more; n++ {
		if n == MaxColumns {
			return n, wideRow
		}
		line = trimBlanks(line, r.delim)
		if v, used := prefixNumber(line, r.dec); used > 0 && quick {
			if end, ok := r.fieldEnd(line, used); ok {
				r.cells = append(r.cells, v)
				numbers++
				more = end <= len(line)
				line = line[min(end, len(line)):]
				continue
			}
		}
		var f []byte
		f, line, more = cutField(line, r.delim)
		v, ok := r.cell(n, f)
		if !ok {
			return n, textRow
		}
		if len(f) > 0 {
			filled++
		}
		if v == v {
			numbers++
		}
		r.cells = append(r.cells, v)
	}
	switch {
	case numbers == 0 && filled == 0:
		r.cells = r.cells[:len(r.cells)-n]
		return 0, emptyRow
	case numbers == 0:
		return n, textRow
	case n == 1 && open && r.goesOn():
		r.cells = append(r.cells, math.NaN())
		return 2, numberRow
	case n == 1:
		return n, textRow
	}
	return n, numberRow
}

// fieldEnd says where the field after a number of used bytes ends: the place
// behind its delimiter, or len(line)+1 at the end of the line. ok is false where
// something other than blanks stands between.
func (r *rowReader) fieldEnd(line []byte, used int) (end int, ok bool) {
	i := used
	for i < len(line) && (line[i] == ' ' || line[i] == '\t') && line[i] != r.delim {
		i++
	}
	switch {
	case i == len(line):
		return len(line) + 1, true
	case line[i] == r.delim:
		return i + 1, true
	}
	return i, r.delim == ' ' && i > used
}

// cell reads one field that is no plain number.
func (r *rowReader) cell(col int, f []byte) (float64, bool) {
	if r.want != nil {
		if col == r.label {
			return float64(r.labelIndex(f)), true
		}
		if col >= len(r.want) || !r.want[col] {
			return math.NaN(), true
		}
	}
	if v, ok := parseNumber(f, r.dec); ok {
		return v, true
	}
	switch missing(f) {
	case overflow:
		r.over++
		fallthrough
	case blank:
		return math.NaN(), true
	}
	return 0, false
}

func (r *rowReader) labelIndex(f []byte) int {
	i, ok := r.seen[string(f)]
	if !ok {
		if r.seen == nil {
			r.seen = map[string]int{}
		}
		i = len(r.labels)
		r.labels = append(r.labels, string(f))
		r.seen[r.labels[i]] = i
	}
	return i
}

// goesOn says whether the number just read goes on with the first column of the
// open block of two columns.
func (r *rowReader) goesOn() bool {
	b := &r.blocks[len(r.blocks)-1]
	if b.cols != 2 || b.rows < 2 {
		return false
	}
	return continues(r.cells[len(r.cells)-5], r.cells[len(r.cells)-3], r.cells[len(r.cells)-1])
}

// continues says whether v can follow a, b in a column of wavelengths: the same
// direction, and no further than five steps away.
func continues(a, b, v float64) bool {
	step, next := b-a, v-b
	return step*next > 0 && math.Abs(next) <= 5*math.Abs(step)
}
