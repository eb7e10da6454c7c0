package scanfile

import (
	"bytes"
	"encoding/csv"
	"errors"
	"io"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
)

// Bounds on a table.
const (
	maxTableBytes = 32 << 20 // of a delimited table
	maxTableCols  = 5000
	maxTableCells = 4_000_000 // blank ones too: a short row has as many as the header
)

// ReadTableBytes is ReadTable on bytes; name's extension says which kind it is.
func ReadTableBytes(name string, data []byte) (*Table, error) {
	switch strings.ToLower(filepath.Ext(name)) {
	case ".xlsx", ".xlsm":
		return readBook(name, data)
	case ".xls":
		return nil, errorf(name, 0, "is a workbook of the old binary format; save it as .xlsx or CSV")
	case ".ods":
		return nil, errorf(name, 0, "is an OpenDocument sheet; save it as .xlsx or CSV")
	}
	if bytes.HasPrefix(data, []byte("PK\x03\x04")) {
		return nil, errorf(name, 0, "is a workbook under the name of a text file; name it .xlsx")
	}
	return readCSV(name, data)
}

// readCSV reads a delimited table. encoding/csv knows neither a byte-order mark
// nor line ends of a lone carriage return: both are gone before it starts.
func readCSV(name string, data []byte) (*Table, error) {
	if len(data) > maxTableBytes {
		return nil, errorf(name, 0, "larger than %d MB, which no table of samples is; check that this is the right file", maxTableBytes>>20)
	}
	text, encoding, err := decode(name, data)
	if err != nil {
		return nil, err
	}
	delim := tableDelimiter(text)
	t := &Table{Path: name, Delimiter: string(delim), Encoding: encoding}
	c := csv.NewReader(bytes.NewReader(text))
	c.Comma = rune(delim)
	c.FieldsPerRecord = -1
	for {
		cells, err := c.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, tableError(name, err)
		}
		line, _ := c.FieldPos(0)
		if len(cells) > maxTableCols {
			return nil, errorf(name, line, "more than %d columns; check that this is the right file", maxTableCols)
		}
		if err := t.add(line, cells); err != nil {
			return nil, err
		}
	}
	return t, t.done()
}

func tableError(name string, err error) error {
	var p *csv.ParseError
	if !errors.As(err, &p) {
		return errorf(name, 0, "%w", err)
	}
	line := p.StartLine
	switch {
	case errors.Is(p.Err, csv.ErrBareQuote):
		return errorf(name, p.Line, `a quotation mark inside a cell; put the whole cell in quotes and double the mark inside: "a ""b"" c"`)
	case errors.Is(p.Err, csv.ErrQuote):
		return errorf(name, line, "a quoted cell begins here and does not end, or text follows its end; close it before the next delimiter")
	}
	return errorf(name, line, "%w", p.Err)
}

// add takes one record: the first with content is the header.
func (t *Table) add(line int, cells []string) error {
	last := 0
	for i := range cells {
		if cells[i] = strings.TrimSpace(strings.ReplaceAll(cells[i], "\u00a0", " ")); cells[i] != "" {
			last = i + 1
		}
	}
	switch {
	case last == 0:
	case t.Header == nil:
		t.Header, t.HeadLine = cells[:last:last], line
	default:
		cells = cells[:max(last, min(len(cells), len(t.Header)))]
		if n := len(t.Header) - len(cells); n > 0 {
			cells = append(slices.Grow(cells, n), make([]string, n)...)
		}
		if t.slots += len(cells); t.slots > maxTableCells {
			return errorf(t.Path, line, "more than %d cells; check that this is the right file", maxTableCells)
		}
		t.Rows = append(t.Rows, Record{Line: line, Cells: cells})
	}
	return nil
}

func (t *Table) done() error {
	if t.Header == nil {
		return errorf(t.Path, 0, "is empty; a table needs a header row")
	}
	return nil
}

// Col returns the place of a column by its name, letters in either case, and
// whether there is one.
func (t *Table) Col(name string) (int, bool) {
	for i, h := range t.Header {
		if strings.EqualFold(h, name) {
			return i, true
		}
	}
	return 0, false
}

// tableDelimiter decides by the header line: the delimiter that cuts it most
// often outside quotes; where two tie, the one that cuts the next lines into as
// many cells.
func tableDelimiter(text []byte) byte {
	head := bytes.TrimLeft(text, "\r\n \ufeff")
	first, rest := cutLine(head)
	best, bestN := byte(','), 0
	for _, d := range []byte{'\t', ';', ','} {
		n := 2 * countOutside(first, d)
		if n == 0 {
			continue
		}
		if second, _ := cutLine(rest); countOutside(second, d)*2 == n {
			n++
		}
		if n > bestN {
			best, bestN = d, n
		}
	}
	return best
}

// countOutside counts d outside quoted cells.
func countOutside(line []byte, d byte) int {
	n, quoted := 0, false
	for _, b := range line {
		switch {
		case b == '"':
			quoted = !quoted
		case b == d && !quoted:
			n++
		}
	}
	return n
}

// formatNumber writes a number in its shortest form without exponent where that
// is not long.
func formatNumber(v float64) string {
	if a := max(v, -v); a != 0 && (a < 1e-6 || a >= 1e21) {
		return strconv.FormatFloat(v, 'g', -1, 64)
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

func (t *Table) note(test, msg string, found, line int) {
	t.Notes = append(t.Notes, eem.Note{Step: "read", Test: test, Severity: eem.Remark,
		Value: float64(found), Measure: true, Msg: msg, File: t.Path, Line: line})
}
