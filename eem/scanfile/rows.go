package scanfile

import (
	"bytes"
	"math"
	"slices"
	"sync"
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
	*store
	delim, dec byte
	skip       int
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

func newRowReader(s *store, delim, dec byte, skip int) *rowReader {
	return &rowReader{store: s, delim: delim, dec: dec, skip: skip, label: -1}
}

// store is the memory that reading a file takes beside what comes out of it.
type store struct {
	text  []byte    // of the file, where it was read here
	cells []float64 // all blocks, row-major, NaN missing
	lines []int32   // the line of every row
	em    []float64 // wavelengths of the scan under way
}

// stores keeps them from file to file: a survey is thousands of small files, and
// memory that was never touched is dearer than the reading.
var stores = sync.Pool{New: func() any { return new(store) }}

// maxStore is the largest text, or number of cells, that is kept.
const maxStore = 1 << 20

func (s *store) release() {
	if cap(s.text) <= maxStore && cap(s.cells) <= maxStore {
		stores.Put(s)
	}
}

// read cuts text. The error is without name.
func (r *rowReader) read(text []byte) *lineError {
	r.cells = slices.Grow(r.cells[:0], min(len(text)/4, maxStore))
	r.lines = r.lines[:0]
	quick := r.want == nil && r.delim != r.dec
	open := false // the last block may go on
	for no := 1; len(text) > 0; no++ {
		r.total = no
		at := len(r.cells)
		if quick && no > r.skip {
			if n, used := r.plainRow(text); n > 0 {
				if err := r.addRow(no, n, at, open); err != nil {
					return err
				}
				open = true
				text = text[used:]
				continue
			}
			r.cells = r.cells[:at]
		}
		var line []byte
		line, text = cutLine(text)
		if no <= r.skip {
			continue
		}
		switch n, kind := r.row(line, open); kind {
		case emptyRow:
		case wideRow:
			return &lineError{no, "more than 10,000 columns, which no scan has; check that this is the right file"}
		case numberRow:
			if err := r.addRow(no, n, at, open); err != nil {
				return err
			}
			open = true
		case textRow:
			r.cells = r.cells[:at]
			open = false
			if len(r.tail) == maxGapLines { // keep the first and the last ones
				r.tail = append(r.tail[:maxGapLines/2], r.tail[maxGapLines*3/4:]...)
			}
			r.tail = append(r.tail, textLine{no, line})
		}
	}
	return nil
}

// addRow adds the row of n cells from at on to the open block, or begins one.
func (r *rowReader) addRow(no, n, at int, open bool) *lineError {
	if !open || r.blocks[len(r.blocks)-1].cols != n {
		if len(r.blocks) == maxBlocks {
			return &lineError{no, "numbers and text alternate all through the file; is it a scan? Export it again as a table"}
		}
		r.blocks = append(r.blocks, block{gap: r.tail, first: no, cols: n, cell: at, row: len(r.lines)})
		r.tail = nil
	}
	b := &r.blocks[len(r.blocks)-1]
	b.last = no
	b.rows++
	b.over += r.over
	r.over = 0
	r.lines = append(r.lines, int32(no))
	return nil
}

// plainRow appends the cells of a line in which every field is a plain number or
// empty, and says how many bytes the line took with its end. For every other
// line n is 0, and what it appended is to be dropped.
//
// Most cells are a number of fewer than eight digits before and after its mark,
// with the delimiter or the end of the line right behind: those are read eight
// digits at a time. The branches of a loop over digits, which no processor can
// foresee, took a third of the time that reading a grid took.
func (r *rowReader) plainRow(text []byte) (n, used int) {
	cells, delim, dec := r.cells, r.delim, r.dec
	i, numbers := 0, 0
	for n < MaxColumns {
		var v float64
		end := 0 // place behind a number, in b
		b := text[i:]
		if len(b) >= 24 {
			sign := 0
			if b[0] == '-' {
				sign = 1
			}
			m, whole := eightDigits(b[sign:])
			end = sign + whole
			places := 0
			if b[end] == dec {
				var f uint64
				f, places = eightDigits(b[end+1:])
				m = m*wholePow10[places] + f
				end += 1 + places
			}
			if c := b[end]; (c == delim || c == '\n') && whole < 8 && places < 8 && whole+places > 0 {
				v = float64(m) / pow10[places]
				if sign == 1 {
					v = -v
				}
				cells = append(cells, v)
				n++
				numbers++
				i += end + 1
				if c == delim {
					continue
				}
				break
			}
		}
		for i < len(text) && text[i] == ' ' {
			i++
		}
		if v, end = prefixNumber(text[i:], dec); end == 0 {
			if delim == ' ' || i < len(text) && text[i] != delim && text[i] != '\n' && text[i] != '\r' {
				return 0, 0
			}
			v = math.NaN()
		} else {
			numbers++
			i += end
		}
		cells = append(cells, v)
		n++
		for delim != ' ' && i < len(text) && text[i] == ' ' {
			i++
		}
		if i < len(text) && text[i] == delim {
			i++
			continue
		}
		switch {
		case i == len(text):
		case text[i] == '\n':
			i++
		case text[i] == '\r' && i+1 < len(text) && text[i+1] == '\n':
			i += 2
		default:
			return 0, 0
		}
		break
	}
	if n < 2 || n == MaxColumns || numbers == 0 {
		return 0, 0 // MaxColumns may be the whole line or not: the slow way knows
	}
	r.cells = cells
	return n, i
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
