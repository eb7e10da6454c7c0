package report

import (
	"fmt"

	"github.com/xuri/excelize/v2"
)

// sheet is a worksheet written row by row.
type sheet struct {
	b    *book
	name string
	w    *excelize.StreamWriter
	row  int // next row, from 1
	wide []float64
	// starts are the columns, from 1, that begin the second and later pages of a
	// print; empty where one page is wide enough.
	starts []int
}

// cell is one cell of a row. v is a string, a number, a time or nil; NaN and
// infinity are written as an empty cell.
type cell struct {
	v any
	l look
}

// add writes the next row; with height 0 it is as high as its wrapped text needs.
func (s *sheet) add(height float64, cells ...cell) {
	if s.b.err != nil {
		return
	}
	row := make([]any, len(cells))
	for i, c := range cells {
		v := c.v
		if f, ok := v.(float64); ok && !finite(f) {
			v = nil
		}
		if t, ok := v.(string); ok {
			v = cut(t, 32000)
		}
		row[i] = excelize.Cell{StyleID: s.b.style(c.l), Value: v}
	}
	if height == 0 {
		height = s.height(cells)
	}
	s.b.try(s.w.SetRow(fmt.Sprintf("A%d", s.row), row, excelize.RowOpts{Height: min(height, 400)}))
	s.row++
}

// heading writes a line above the table. Where print cuts the sheet into pages side
// by side, every page repeats the first column, and a text in it would run into each
// of them: there it stands behind that column, as wide as the first page.
func (s *sheet) heading(height float64, text string, l look) {
	if len(s.starts) == 0 {
		s.add(height, cell{text, l})
		return
	}
	last, px := s.starts[0]-1, 0
	for _, w := range s.wide[1:last] {
		px += columnPixels(w)
	}
	l.wrap = true
	s.add(max(height, lineHeight(text, px, cellLetters())), cell{}, cell{text, l})
	if last > 2 {
		s.merge(2, last)
	}
}

// height is what the wrapped texts of a row need in their columns. Programs do
// not agree on whether they find it themselves.
func (s *sheet) height(cells []cell) float64 {
	h := rowHeight
	for i, c := range cells {
		if t, ok := c.v.(string); ok && c.l.wrap && i < len(s.wide) {
			letters := cellLetters()
			if c.l.bold {
				letters = boldLetters()
			}
			px := columnPixels(s.wide[i])
			if c.l.indent {
				px -= 9
			}
			h = max(h, lineHeight(t, px, letters))
		}
	}
	return h
}

func finite(v float64) bool { return v-v == 0 }

// skip leaves n rows empty.
func (s *sheet) skip(n int) { s.row += n }

// merge joins the columns from … to (counted from 1) of the row written last.
func (s *sheet) merge(from, to int) {
	if s.b.err != nil {
		return
	}
	a, _ := excelize.CoordinatesToCellName(from, s.row-1)
	z, _ := excelize.CoordinatesToCellName(to, s.row-1)
	s.b.try(s.w.MergeCell(a, z))
}

// table makes rows first … the last written, columns 1 … n, a defined table with
// filters.
func (s *sheet) table(name string, first, n int) {
	if s.b.err != nil {
		return
	}
	stripes := true
	end, _ := excelize.CoordinatesToCellName(n, max(s.row-1, first+1))
	s.b.try(s.w.AddTable(&excelize.Table{Range: fmt.Sprintf("A%d:%s", first, end), Name: name, StyleName: "TableStyleLight1", ShowRowStripes: &stripes}))
}

func (s *sheet) done() {
	if s.b.err == nil {
		s.b.try(s.w.Flush())
	}
}
