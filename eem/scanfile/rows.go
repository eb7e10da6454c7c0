package scanfile

import (
	"slices"
	"sync"
)

// Bounds on what is kept of a file beside its numbers, so that a file of text or
// rubble costs no more memory than a few times its size.
const (
	maxGapLines = 2000   // text lines kept between two blocks of numbers
	maxBlocks   = 20_000 // blocks of numbers in one file, and
	freeBlocks  = 500    // how many it may have, beside one for every
	blockBytes  = 32     // bytes of text: a scan with its header has more
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
	most       int        // blocks that it may have
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
	r.most = min(maxBlocks, freeBlocks+len(text)/blockBytes)
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
		if len(r.blocks) == r.most {
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

// lineError is an error at a line of a file whose name the caller knows.
type lineError struct {
	line int
	msg  string
}
