package scanfile

import (
	"bytes"
	"math"
	"slices"

	"tarnlight/eem"
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
		return 0, errorf(r.name, e.unclearAt, `%w; set scans.decimal = "," or "."`, err)
	}
	return d[0], nil
}

// longShape finds out which of three unnamed columns is which by their structure:
// one is constant in runs, the other runs through the wavelengths in each. It
// returns the outer and inner column, nil where the block is not of this shape.
func (r *reader) longShape(b *block) *[2]int {
	for _, c := range [][2]int{{0, 1}, {1, 0}} {
		if r.runs(b, c[0], c[1]) {
			return &c
		}
	}
	return nil
}

func (r *reader) runs(b *block, outer, inner int) bool {
	run := 0
	for i := range b.rows {
		row := r.rowCells(b, i)
		if !(row[outer] >= lowestNM) || !(row[inner] >= lowestNM) {
			return false
		}
		if i > 0 {
			last := r.rowCells(b, i-1)
			if row[outer] != last[outer] {
				if run < 2 {
					return false
				}
				run = 0
			} else if run > 1 && (row[inner]-last[inner])*(last[inner]-r.rowCells(b, i-2)[inner]) <= 0 {
				return false
			}
		}
		run++
	}
	return run >= 2
}

// longByShape reads a long file whose columns have no names.
func (r *reader) longByShape() error {
	b := &r.main[0]
	cols := r.usedCols(b)
	refuse := func() error {
		return errorf(r.name, b.first, "cannot tell which of the columns is the excitation and which the emission; write ex_nm, em_nm, intensity above them")
	}
	if cols != 3 {
		return errorf(r.name, b.first, "%d columns, where a long table has three; write ex_nm, em_nm, intensity above those that matter", cols)
	}
	shape := r.longShape(b)
	if shape == nil {
		return refuse()
	}
	var w balance
	for i := range r.main {
		for k := range r.main[i].rows {
			row := r.rowCells(&r.main[i], k)
			if len(row) < 3 {
				return errorf(r.name, r.main[i].first, "%d columns where the rows above have %d; repair the line", len(row), b.cols)
			}
			w.add(row[shape[0]], row[shape[1]], row[2])
		}
	}
	l := longColumns{ex: shape[0], em: shape[1], f: 2, label: -1}
	switch v := w.verdict(); {
	case v == 0:
		return refuse()
	case v < 0:
		l.ex, l.em = l.em, l.ex
	}
	r.how = "a long table: excitation, emission and intensity by what the columns hold"
	return r.long(r.main, l)
}

// maxScans bounds the scans of one file.
const maxScans = 200_000

// longScan gathers the rows of one scan.
type longScan struct {
	ex    float64
	label string
	em, f []float64
	lines []int32
}

// long gathers the rows of a long table by sample and excitation.
func (r *reader) long(blocks []block, l longColumns) error {
	said := func(c int) bool { return len(l.head) > c && wavenumberWord.Match(l.head[c]) }
	type key struct{ ex, label float64 }
	at := map[key]int{}
	var scans []longScan
	last, cur := key{math.NaN(), 0}, -1
	for i := range blocks {
		b := &blocks[i]
		for k := range b.rows {
			row := r.rowCells(b, k)
			id := key{ex: row[l.ex]}
			if l.label >= 0 {
				id.label = row[l.label]
			}
			switch {
			case id.ex != id.ex && row[l.em] != row[l.em] && row[l.f] != row[l.f]:
				continue
			case id.ex != id.ex:
				return errorf(r.name, r.line(b, k), "no excitation in this row; fill it in, or take the row out")
			case id != last:
				var ok bool
				if cur, ok = at[id]; !ok {
					if len(scans) == maxScans {
						return errorf(r.name, r.line(b, k), "more than %d different excitations; is this the excitation column? Write ex_nm, em_nm, intensity above the columns", maxScans)
					}
					cur = len(scans)
					at[id] = cur
					s := longScan{ex: id.ex}
					if l.label >= 0 {
						s.label = r.rows.labels[int(id.label)]
					}
					scans = append(scans, s)
				}
				last = id
			}
			s := &scans[cur]
			s.em, s.f, s.lines = append(s.em, row[l.em]), append(s.f, row[l.f]), append(s.lines, r.rows.lines[b.row+k])
		}
	}
	return r.longScans(scans, said(l.ex), said(l.em))
}

func (r *reader) longScans(scans []longScan, exSaid, emSaid bool) error {
	exs := make([]float64, len(scans))
	for i := range scans {
		exs[i] = scans[i].ex
	}
	r.toNM(exs, exSaid)
	var shared eem.Axis // most scans have the axis of the one before
	var before []float64
	var o order
	for i := range scans {
		s := &scans[i]
		line := func(k int) int { return int(s.lines[k]) }
		if !(exs[i] >= lowestNM && exs[i] <= highestNM) {
			return errorf(r.name, line(0), "excitation %g nm is no wavelength of a fluorometer (%d to %d nm)", exs[i], lowestNM, highestNM)
		}
		r.toNM(s.em, emSaid)
		if !slices.Equal(s.em, before) || o.unsorted || o.repeated > 0 {
			var err error
			if shared, o, err = r.axis(s.em, line); err != nil {
				return err
			}
			before = s.em
		}
		r.add(eem.Scan{Ex: exs[i], Em: shared, F: o.apply(s.f), Line: line(0)}, s.label)
	}
	return nil
}
