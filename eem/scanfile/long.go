package scanfile

import (
	"bytes"
)

// longColumns says which column of a long file is which.
type longColumns struct {
	ex, em, f, label int // label −1: no column with the sample's name
	head             [][]byte
	line             int // of the header
	delim            byte
	text             bool // rows hold text, so that they must be read by column
}

// longHeader looks for a header line that names an excitation and an emission
// column beside others.
func (r *reader) longHeader() (longColumns, bool) {
	if len(r.main) > 0 {
		b := &r.main[0]
		for t := range b.headers {
			f := r.header(t)
			if len(f) < r.usedCols(b) || len(f) > b.cols {
				continue
			}
			if l, ok := longRoles(f); ok {
				l.line, l.delim, l.text = t.no, r.rows.delim, l.label >= 0
				return l, true
			}
		}
		if b.rows > 2 {
			return longColumns{}, false
		}
	}
	return r.longText()
}

// longText looks for such a header anywhere in the text, for files whose rows
// hold text and so are no rows of numbers.
func (r *reader) longText() (longColumns, bool) {
	for i := range r.rows.blocks {
		if l, ok := r.longLine(r.rows.blocks[i].gap); ok {
			return l, true
		}
	}
	return r.longLine(r.rows.tail)
}

func (r *reader) longLine(list []textLine) (longColumns, bool) {
	for _, t := range list {
		for _, d := range delimiters {
			if r.set.Delimiter != "" && d != r.set.Delimiter[0] || bytes.Count(t.text, []byte{d}) < 2 {
				continue
			}
			if l, ok := longRoles(splitFields(t.text, d)); ok {
				l.line, l.delim, l.text = t.no, d, true
				return l, true
			}
		}
	}
	return longColumns{}, false
}

// longRoles reads a header as that of a long file. f is −1 where the intensity
// is not clear.
func longRoles(f [][]byte) (longColumns, bool) {
	l := longColumns{ex: -1, em: -1, f: -1, label: -1, head: f}
	if len(f) < 3 {
		return l, false
	}
	var named, others []int
	for i, c := range f {
		switch k, _ := roleOf(c); {
		case k == exRole && l.ex < 0 && leadingDigits(bytes.TrimLeft(c, "exEX _=:-")) == 0:
			l.ex = i
		case k == emRole && l.em < 0:
			l.em = i
		case k == exRole || k == emRole || k == cornerRole:
			return l, false
		case k == intensityRole:
			named = append(named, i)
		case k == sampleRole && l.label < 0:
			l.label = i
		case len(c) > 0:
			others = append(others, i)
		}
	}
	if l.ex < 0 || l.em < 0 {
		return l, false
	}
	switch {
	case len(named) == 1:
		l.f = named[0]
	case len(named) == 0 && len(others) == 1:
		l.f = others[0]
	}
	return l, true
}

// named reads a long file by the names of its columns.
func (r *reader) named(l longColumns) error {
	r.file.Form = Long
	r.how = "a long table: excitation, emission and intensity by the names of the columns"
	if l.f < 0 {
		return errorf(r.name, l.line, "excitation and emission are named, but not which column is the intensity (%s); name one column intensity",
			clip(bytes.Join(l.head, []byte(", "))))
	}
	blocks := r.main
	if l.text {
		var err error
		if blocks, err = r.readByColumn(&l); err != nil {
			return err
		}
	}
	if err := r.damaged(blocks, l); err != nil {
		return err
	}
	r.over = 0
	for i := range blocks {
		if blocks[i].cols <= max(l.ex, l.em, l.f, l.label) {
			return errorf(r.name, blocks[i].first, "%d columns where the header has %d; repair the line", blocks[i].cols, len(l.head))
		}
		r.over += blocks[i].over
	}
	if len(blocks) == 0 {
		return errorf(r.name, l.line, "no rows of numbers below this header")
	}
	r.file.HeaderLines = blocks[0].first - 1
	r.file.FooterLines = r.rows.total - blocks[len(blocks)-1].last
	return r.long(blocks, l)
}

// damaged refuses a line of text that has the columns of the header and stands
// between rows, or begins like one.
func (r *reader) damaged(blocks []block, l longColumns) error {
	check := func(list []textLine, inside bool) error {
		for _, t := range list {
			f := splitFields(t.text, l.delim)
			if t.no <= l.line || len(f) != len(l.head) || !inside && leadingDigits(f[l.ex]) == 0 {
				continue
			}
			for _, c := range []int{l.ex, l.em, l.f} {
				if _, ok := parseNumber(f[c], r.rows.dec); !ok && missing(f[c]) == present {
					return r.badCell(t.no, f[c])
				}
			}
		}
		return nil
	}
	for i := range blocks {
		if err := check(blocks[i].gap, i > 0); err != nil {
			return err
		}
	}
	return check(r.rows.tail, false)
}

// readByColumn reads the rows again, the columns that matter only.
func (r *reader) readByColumn(l *longColumns) ([]block, error) {
	dec := r.rows.dec
	if r.set.Decimal == "" {
		var err error
		if dec, err = r.columnDecimal(l); err != nil {
			return nil, err
		}
	}
	rr := newRowReader(new(store), l.delim, dec, l.line)
	rr.want, rr.label = make([]bool, len(l.head)), l.label
	rr.want[l.ex], rr.want[l.em], rr.want[l.f] = true, true, true
	if e := rr.read(r.text); e != nil {
		return nil, errorf(r.name, e.line, "%s", e.msg)
	}
	r.rows = rr
	r.file.Delimiter, r.file.Decimal = string(l.delim), string(dec)
	return rr.blocks, nil
}

// columnDecimal decides the decimal mark from the columns that matter.
func (r *reader) columnDecimal(l *longColumns) (byte, error) {
	var e evidence
	text := r.text
	for no := 1; len(text) > 0 && e.point+e.comma < enoughCells; no++ {
		var line []byte
		line, text = cutLine(text)
		if no <= l.line {
			continue
		}
		f := splitFields(line, l.delim)
		for _, c := range []int{l.ex, l.em, l.f} {
			if c < len(f) {
				e.add(f[c], no)
			}
		}
	}
	d, err := e.decide()
	if err != nil {
		return 0, errorf(r.name, e.unclearAt, `%w; set scans.decimal to "comma" or "point"`, err)
	}
	return d[0], nil
}
