package scanfile

import "bytes"

// sureCells is how many numbers must have been written alike before one that is
// shorter is taken for cut off. A program that leaves zeros out at the end writes one
// number in ten with fewer decimals: that forty had as many and the last one has not
// happens in one file of 700 (0.9⁴⁰ · 0.1), of those that lack the last line end.
const sureCells = 40

// cutOff refuses a file that ends in the middle of a number: its last line has no
// line end, and the last number fewer decimals, or digits of the exponent, than
// every other one of its column. What is left of 1234.5 would be read as 12.
func (r *reader) cutOff() error {
	n := len(r.rows.blocks)
	if n == 0 || len(r.rows.tail) > 0 || r.rows.want != nil || len(r.text) == 0 || r.text[len(r.text)-1] == '\n' {
		return nil
	}
	z := &r.rows.blocks[n-1]
	rest := r.text
	lastLine := lastOf(&rest)
	f := splitFields(lastLine, r.rows.delim)
	if z.last != r.rows.total || len(f) < 2 {
		return nil
	}
	last := shapeOf(f[len(f)-1], r.rows.dec)
	seen, want := 0, numberShape{}
	for row := 1; row < z.rows && seen < sureCells && len(rest) > 0; row++ {
		above := splitFields(lastOf(&rest), r.rows.delim)
		if len(above) != len(f) || missing(above[len(f)-1]) != present {
			continue
		}
		s := shapeOf(above[len(f)-1], r.rows.dec)
		if seen++; seen == 1 {
			want = s
		}
		if s != want {
			return nil
		}
	}
	if seen < sureCells || last.exponent >= want.exponent && last.decimals >= want.decimals || missing(f[len(f)-1]) != present {
		return nil
	}
	return errorf(r.name, z.last, "%q, the last number, has fewer digits than all others and no line end follows; was the file cut short? Export it again", clip(f[len(f)-1]))
}

// lastOf takes the last line off text.
func lastOf(text *[]byte) []byte {
	t := bytes.TrimRight(*text, "\r\n")
	i := bytes.LastIndexByte(t, '\n')
	*text = t[:max(i, 0)]
	return bytes.TrimRight(t[i+1:], "\r")
}

// numberShape is how a number is written: digits behind the decimal mark and
// characters of the exponent.
type numberShape struct{ decimals, exponent int }

func shapeOf(cell []byte, dec byte) (s numberShape) {
	if i := bytes.IndexAny(cell, "eEdD"); i >= 0 {
		s.exponent = len(cell) - i
		cell = cell[:i]
	}
	if i := bytes.IndexByte(cell, dec); i >= 0 {
		s.decimals = len(cell) - i - 1
	}
	return s
}
