package scanfile

import (
	"bytes"
	"math"
)

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
		if b := text[i:]; len(b) >= 24 {
			sign := 0
			if b[0] == '-' {
				sign = 1
			}
			m, whole := eightDigits(b[sign:])
			end := sign + whole // place behind the number
			places := 0
			if b[end] == dec {
				var f uint64
				f, places = eightDigits(b[end+1:])
				m = m*wholePow10[places] + f
				end += 1 + places
			}
			if c := b[end]; (c == delim || c == '\n') && whole < 8 && places < 8 && whole+places > 0 {
				v := float64(m) / pow10[places]
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
		v, used := prefixNumber(text[i:], dec)
		if used == 0 {
			if delim == ' ' || i < len(text) && text[i] != delim && text[i] != '\n' && text[i] != '\r' {
				return 0, 0
			}
			v = math.NaN()
		} else {
			numbers++
			i += used
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
