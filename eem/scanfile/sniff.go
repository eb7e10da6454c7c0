package scanfile

import "bytes"

// delimiters in the order in which they win when two explain a file equally.
var delimiters = [...]byte{'\t', ';', ',', ' '}

// cutField returns the first field of a line, trimmed and without quotes, and
// what follows its delimiter. more is false at the last field. With the blank as
// delimiter, runs of blanks and tabs separate and the line must be trimmed.
func cutField(line []byte, delim byte) (field, rest []byte, more bool) {
	line = trimBlanks(line, delim)
	if len(line) > 1 && line[0] == '"' {
		if i := bytes.IndexByte(line[1:], '"'); i >= 0 {
			field, rest = line[1:1+i], trimBlanks(line[2+i:], delim)
			if len(rest) == 0 {
				return bytes.TrimSpace(field), nil, false
			}
			if rest[0] == delim {
				return bytes.TrimSpace(field), rest[1:], true
			}
			if delim == ' ' {
				return bytes.TrimSpace(field), rest, true
			}
		}
	}
	i := bytes.IndexByte(line, delim)
	if delim == ' ' {
		i = bytes.IndexAny(line, " \t")
	}
	if i < 0 {
		return bytes.TrimSpace(line), nil, false
	}
	return bytes.TrimSpace(line[:i]), line[i+1:], true
}

// trimBlanks drops blanks at the start, and tabs where they do not separate.
func trimBlanks(b []byte, delim byte) []byte {
	for len(b) > 0 && (b[0] == ' ' || b[0] == '\t' && delim != '\t') {
		b = b[1:]
	}
	return b
}

// splitFields returns the fields of a line, at most MaxColumns + 1.
func splitFields(line []byte, delim byte) [][]byte {
	if delim == ' ' {
		line = bytes.TrimSpace(line)
	}
	out := make([][]byte, 0, min(bytes.Count(line, []byte{delim}), MaxColumns)+1)
	for more := true; more && len(out) <= MaxColumns; {
		var f []byte
		f, line, more = cutField(line, delim)
		out = append(out, f)
	}
	return out
}

// looseRow returns the number of fields of a line of numbers, whichever the
// decimal mark: two fields or more, each a number or a mark of a missing one,
// the numbers not fewer than one. It returns 0 for every other line.
func looseRow(line []byte, delim byte) int {
	if delim == ' ' {
		line = bytes.TrimSpace(line)
	}
	n, numbers := 0, 0
	for more := true; more; n++ {
		var f []byte
		f, line, more = cutField(line, delim)
		switch {
		case delim != ';' && delim != '\t' && bytes.IndexByte(f, ' ') >= 0:
			return 0 // groups set apart by a blank need a delimiter that is none
		case looksNumeric(f):
			numbers++
		case missing(f) == present:
			return 0
		}
		if n > MaxColumns {
			return n // refused later
		}
	}
	if n < 2 || numbers == 0 {
		return 0
	}
	return n
}

// enoughRows is how many like rows in succession settle the delimiter: no other
// delimiter can cut that many lines into whole numbers only.
const enoughRows = 16

// sniffDelimiter returns the delimiter under which the longest run of lines are
// rows of numbers of one length; 0 where there is no such line.
func sniffDelimiter(text []byte) byte {
	var best byte
	bestRows := 0
	for _, d := range delimiters {
		if bytes.IndexByte(text, d) < 0 && (d != ' ' || bytes.IndexByte(text, '\t') < 0) {
			continue
		}
		if n := likeRows(text, d); n > bestRows {
			best, bestRows = d, n
		}
		if bestRows >= enoughRows {
			break
		}
	}
	return best
}

// likeRows returns the longest run of rows with one number of fields, counting
// no further than enoughRows.
func likeRows(text []byte, delim byte) int {
	best, run, cols := 0, 0, 0
	quick := rowReader{store: new(store), delim: delim, dec: '.'}
	for len(text) > 0 && best < enoughRows {
		quick.cells = quick.cells[:0]
		n, used := quick.plainRow(text)
		if n > 0 {
			text = text[used:]
		} else {
			var line []byte
			line, text = cutLine(text)
			n = looseRow(line, delim)
			switch {
			case n == 0 && len(bytes.TrimSpace(line)) == 0:
				continue
			case n == 0:
				run = 0
				continue
			}
		}
		if n != cols {
			run = 0
		}
		cols = n
		if run++; run*n >= enoughRows*enoughRows && run > 3 {
			return enoughRows // wide rows settle it sooner
		}
		best = max(best, run)
	}
	return best
}

// enoughCells is how many cells that agree settle the decimal mark.
const enoughCells = 1000

// sniffDecimal decides the decimal mark from the rows of numbers of a file. line
// is where the first cell stands that makes it unclear.
func sniffDecimal(text []byte, delim byte) (dec byte, line int, err error) {
	if bytes.IndexByte(text, ',') < 0 || delim == ',' && bytes.IndexByte(text, '"') < 0 {
		return '.', 0, nil // no comma that could be a decimal one
	}
	var e, heads evidence // rows of numbers; header rows, where those say nothing
	for no := 1; len(text) > 0 && e.point+e.comma < enoughCells; no++ {
		var row []byte
		row, text = cutLine(text)
		if looseRow(row, delim) > 0 {
			e.addRow(row, delim, no)
		} else if row = afterLabel(row, delim); looseRow(row, delim) > 0 {
			heads.addRow(row, delim, no)
		}
	}
	if e.point+e.comma == 0 {
		e.merge(heads)
	}
	mark, err := e.decide()
	if err == nil {
		return mark[0], 0, nil
	}
	if e.point > 0 {
		return 0, max(e.pointAt, e.commaAt), err
	}
	return 0, e.unclearAt, err
}

// afterLabel returns a line without its first field, which in a header row of
// wavelengths is a label.
func afterLabel(line []byte, delim byte) []byte {
	if _, rest, more := cutField(line, delim); more {
		return rest
	}
	return nil
}
