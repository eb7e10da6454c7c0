package scanfile

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
