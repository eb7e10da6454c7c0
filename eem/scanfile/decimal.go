package scanfile

import (
	"bytes"
	"fmt"
	"strings"
)

// DecimalMark decides the decimal mark of a column or file from all its cells:
// "." or ",". Cells that are no numbers are left out; where no cell has either
// mark it is ".". Cells that all can be read twice ("1,234"), and cells that
// contradict each other, are an error.
func DecimalMark(cells []string) (string, error) {
	var e evidence
	for i, c := range cells {
		e.add([]byte(strings.TrimSpace(c)), i)
	}
	return e.decide()
}

// evidence gathers what the cells of one file say about its decimal mark.
type evidence struct {
	point, comma     int    // cells that can be read one way only
	unclear          int    // cells such as 1,234
	pointAt, commaAt int    // place (line) of the first such cell
	pointCell        string // and its text
	commaCell        string
	unclearAt        int
	unclearCell      string
}

// add looks at one trimmed cell; at is its place for messages.
func (e *evidence) add(b []byte, at int) {
	p, c := bytes.Count(b, []byte(".")), bytes.Count(b, []byte(","))
	if p+c == 0 || len(b) > maxNumberBytes {
		return
	}
	var buf [64]byte
	_, asPoint := cleanNumber(buf[:0], b, '.')
	_, asComma := cleanNumber(buf[:0], b, ',')
	switch {
	case asPoint && !asComma:
		e.point++
		if e.point == 1 {
			e.pointAt, e.pointCell = at, string(b)
		}
	case asComma && !asPoint:
		e.comma++
		if e.comma == 1 {
			e.commaAt, e.commaCell = at, string(b)
		}
	case asPoint && c > 0: // 1,234; 1.234 is a decimal point unless something speaks against it
		e.unclear++
		if e.unclear == 1 {
			e.unclearAt, e.unclearCell = at, string(b)
		}
	}
}

// merge adds what h found to e, which has no cell that can be read one way only.
func (e *evidence) merge(h evidence) {
	if e.unclear > 0 {
		h.unclearAt, h.unclearCell = e.unclearAt, e.unclearCell
	}
	h.unclear += e.unclear
	*e = h
}

func (e *evidence) decide() (string, error) {
	switch {
	case e.point > 0 && e.comma > 0:
		return "", fmt.Errorf("%q has a decimal point and %q a decimal comma", e.pointCell, e.commaCell)
	case e.comma > 0:
		return ",", nil
	case e.point > 0 || e.unclear == 0:
		return ".", nil
	}
	return "", fmt.Errorf("%q can be read as a decimal comma and as a thousands comma", e.unclearCell)
}

// addRow adds every field of a line.
func (e *evidence) addRow(line []byte, delim byte, no int) {
	if delim == ' ' {
		line = bytes.TrimSpace(line)
	}
	for more := true; more; {
		var f []byte
		f, line, more = cutField(line, delim)
		e.add(f, no)
	}
}
