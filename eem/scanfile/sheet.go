package scanfile

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"time"
)

// sheetReader reads the rows of one sheet.
type sheetReader struct {
	*book
	d      *xml.Decoder
	t      *Table
	row    int
	cells  []string // of the row under way
	hidden []int    // rows with content
}

// table streams the sheet into a Table.
func (b *book) table(sheet string) (*Table, error) {
	data, err := b.part(sheet)
	if err != nil {
		return nil, err
	}
	s := &sheetReader{book: b, d: xml.NewDecoder(bytes.NewReader(data)), t: &Table{Path: b.name}}
	for {
		tok, err := s.d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return nil, errorf(b.name, 0, "sheet %s: %w; save the workbook again", b.sheet, err)
		}
		e, ok := tok.(xml.StartElement)
		if !ok {
			continue
		}
		switch e.Name.Local {
		case "row":
			err = s.readRow(e)
		case "mergeCell":
			if ref := attr(e, "ref"); strings.Contains(ref, ":") {
				err = b.cellError(ref, "merged cells; nobody can know which rows they are meant for: unmerge them and fill in every cell")
			}
		}
		if err != nil {
			return nil, err
		}
	}
	if n := len(s.hidden); n > 0 {
		s.t.note("sheet-hidden", fmt.Sprintf("%d hidden rows of sheet %s were read like the others (the first is row %d)", n, b.sheet, s.hidden[0]), n, s.hidden[0])
	}
	return s.t, s.t.done()
}

func attr(e xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if a.Name.Local == name {
			return a.Value
		}
	}
	return ""
}

// readRow reads one row up to its end.
func (s *sheetReader) readRow(e xml.StartElement) error {
	s.row++
	if r, err := strconv.Atoi(attr(e, "r")); err == nil {
		s.row = r
	}
	s.cells = nil
	for {
		tok, err := s.d.Token()
		if err != nil {
			return errorf(s.name, s.row, "sheet %s: %w; save the workbook again", s.sheet, err)
		}
		switch x := tok.(type) {
		case xml.StartElement:
			if x.Name.Local == "c" {
				err = s.readCell(x)
			} else if err = s.d.Skip(); err != nil {
				err = errorf(s.name, s.row, "sheet %s: %w; save the workbook again", s.sheet, err)
			}
			if err != nil {
				return err
			}
		case xml.EndElement:
			before := len(s.t.Rows)
			head := s.t.Header == nil
			if err := s.t.add(s.row, s.cells); err != nil {
				return err
			}
			if isTrue(attr(e, "hidden")) && (len(s.t.Rows) > before || head && s.t.Header != nil) {
				s.hidden = append(s.hidden, s.row)
			}
			return nil
		}
	}
}

// xmlCell is one cell as stored.
type xmlCell struct {
	V  *string   `xml:"v"`
	F  *struct{} `xml:"f"`
	IS *richText `xml:"is"`
}

func (s *sheetReader) readCell(e xml.StartElement) error {
	col := len(s.cells) + 1
	if ref := attr(e, "r"); ref != "" {
		var ok bool
		if col, _, ok = cellRef(ref); !ok {
			return errorf(s.name, s.row, "sheet %s: %q is no cell; save the workbook again", s.sheet, ref)
		}
	}
	var c xmlCell
	if err := s.d.DecodeElement(&c, &e); err != nil {
		return errorf(s.name, s.row, "sheet %s: %w; save the workbook again", s.sheet, err)
	}
	text, err := s.value(&c, attr(e, "t"), attr(e, "s"), cellName(col, s.row))
	if err != nil || text == "" {
		return err
	}
	if col > maxTableCols {
		return s.cellError(cellName(col, s.row), "a cell beyond %d columns; delete what is not part of the table", maxTableCols)
	}
	for len(s.cells) < col {
		s.cells = append(s.cells, "")
	}
	s.cells[col-1] = text
	return nil
}

// value turns a stored cell into text.
func (s *sheetReader) value(c *xmlCell, kind, style, ref string) (string, error) {
	v := ""
	if c.V != nil {
		v = *c.V
	}
	switch {
	case v != "":
	case c.IS != nil:
		return c.IS.String(), nil
	case c.F != nil && (c.V == nil || kind != "str"): // "" may be the result of a formula
		return "", s.cellError(ref, "a formula without a stored result; open the workbook in a spreadsheet program and save it, or fill in the value")
	default:
		return "", nil
	}
	switch kind {
	case "e":
		return "", s.cellError(ref, "%s is the error value of a formula; repair it or clear the cell", v)
	case "s":
		i, err := strconv.Atoi(strings.TrimSpace(v))
		if err != nil || i < 0 || i >= len(s.strings) {
			return "", s.cellError(ref, "refers to a text that the workbook lacks; save it again")
		}
		return s.strings[i], nil
	case "str", "inlineStr", "d":
		return v, nil
	case "b":
		if isTrue(v) {
			return "TRUE", nil
		}
		return "FALSE", nil
	}
	if strings.TrimSpace(v) == "" {
		return "", nil
	}
	x, err := strconv.ParseFloat(strings.TrimSpace(v), 64)
	if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
		return "", s.cellError(ref, "%.40q is not a number; clear the cell", v)
	}
	if i, err := strconv.Atoi(style); err == nil && i >= 0 && i < len(s.date) && s.date[i] {
		t, ok := dateText(x, s.from04)
		if !ok {
			return "", s.cellError(ref, "%g is shown as a date but is none; write the date as text, 2026-05-03", x)
		}
		return t, nil
	}
	return formatNumber(x), nil
}

// dateText writes a date number of a spreadsheet in ISO 8601: the date, date and
// time to the second, or for a number below 1 the time. Day 60 of the calendar
// that begins with 1900 is 29 February 1900, which never was.
func dateText(x float64, from04 bool) (string, bool) {
	if x < 0 || x > 2_958_465.999 { // the end of the year 9999
		return "", false
	}
	origin := time.Date(1899, 12, 30, 0, 0, 0, 0, time.UTC)
	switch {
	case from04:
		origin = time.Date(1904, 1, 1, 0, 0, 0, 0, time.UTC)
	case x >= 60 && x < 61:
		return "", false
	case x < 60:
		origin = origin.AddDate(0, 0, 1)
	}
	day := math.Floor(x)
	secs := int(math.Round((x - day) * 86400))
	t := origin.AddDate(0, 0, int(day)).Add(time.Duration(secs) * time.Second)
	switch {
	case x < 1 && !from04:
		return t.Format(time.TimeOnly), true
	case t.Equal(t.Truncate(24 * time.Hour)):
		return t.Format(time.DateOnly), true
	}
	return t.Format("2006-01-02T15:04:05"), true
}
