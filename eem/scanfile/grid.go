package scanfile

import (
	"bytes"
	"math"

	"tarnlight/eem"
)

// gridHead is the header row of a grid.
type gridHead struct {
	across []float64 // the wavelengths of columns 1, 2, …, as written
	corner []byte    // what stands above the first column
	above  []textLine
	from   int  // the first row of the block that is no header
	exSaid bool // the cells themselves say that they are excitations
}

// gridHead looks for a header row of wavelengths: the lowest line of text that
// has one in every cell but the first; else a row of numbers alone above the
// block, one shorter; else the block's first row when it has no wavelength of its
// own.
func (r *reader) gridHead(b *block) (gridHead, bool) {
	used := r.usedCols(b)
	for t := range b.headers {
		if h, ok := r.textHead(r.header(t), b, used); ok {
			h.above = b.gap
			return h, true
		}
	}
	if n := len(b.above); n > 1 && n == used-1 && monotonic(b.above) && b.above[0] >= lowestNM {
		return gridHead{across: b.above, above: b.gap}, true
	}
	if b.rows < 2 {
		return gridHead{}, false
	}
	row := r.rowCells(b, 0)[:used]
	if row[0] >= lowestNM || used > 2 && !monotonic(row[1:]) || b.rows < 2 {
		return gridHead{}, false
	}
	for _, v := range row[1:] {
		if !(v >= lowestNM) {
			return gridHead{}, false
		}
	}
	for _, v := range r.col(b, 0, 1) {
		if !(v >= lowestNM) {
			return gridHead{}, false
		}
	}
	return gridHead{across: row[1:], above: b.gap, from: 1}, true
}

// textHead reads a header line as wavelengths.
func (r *reader) textHead(f [][]byte, b *block, used int) (gridHead, bool) {
	var h gridHead
	switch n := len(f); {
	case n >= used && n <= b.cols && n >= 2, n > used && r.rows.delim == ' ':
		if r.rows.delim == ' ' && n > used { // a label of several words
			h.corner = bytes.Join(f[:n-used+1], []byte(" "))
			f = f[n-used+1:]
		} else {
			h.corner, f = f[0], f[1:]
		}
	case n == used-1 && n >= 2: // no cell above the first column
	default:
		return h, false
	}
	plain, rest := true, ""
	for i, c := range f {
		v, ok := parseNumber(c, r.rows.dec)
		if !ok {
			var what string
			if v, what, ok = cellEx(string(c), r.pat); !ok || i > 0 && what != rest {
				return h, false // no wavelength, or samples beside each other
			}
			rest = what
			plain = plain && plainNM.Match(bytes.TrimSpace(c))
		}
		if !(v >= lowestNM) {
			return h, false
		}
		h.across = append(h.across, v)
	}
	h.exSaid = !plain
	k, _ := roleOf(h.corner)
	wavelengths := len(h.corner) == 0 || k == cornerRole || k == exRole || k == emRole || k == waveRole
	switch {
	case len(f) == 1: // of two columns "gain, 500" must not become an excitation
		return h, wavelengths
	case h.exSaid:
		return h, true
	}
	return h, wavelengths || monotonic(h.across)
}

// grids reads blocks that are grids.
func (r *reader) grids() error {
	for i := range r.main {
		b := &r.main[i]
		h, ok := r.gridHead(b)
		if !ok {
			return errorf(r.name, b.first, "no row of wavelengths above these %d columns; a grid has excitations in its first row and emissions in its first column, or the transpose", b.cols)
		}
		down, err := r.emissionDown(b, &h)
		if err != nil {
			return err
		}
		sample := ""
		if len(r.main) > 1 {
			sample = b.sample()
		}
		if down {
			r.how = "a grid: excitations across, emissions down"
			err = r.gridDown(b, &h, sample)
		} else {
			r.how = "a grid: emissions across, excitations down"
			err = r.gridAcross(b, &h, sample)
		}
		if err != nil {
			return err
		}
	}
	return nil
}

// gridDown reads a grid with emissions in the first column.
func (r *reader) gridDown(b *block, h *gridHead, sample string) error {
	em := r.col(b, 0, h.from)
	r.toNM(em, wavenumberWord.Match(h.corner))
	axis, o, err := r.axis(em, func(i int) int { return r.line(b, i+h.from) })
	if err != nil {
		return err
	}
	exs, err := r.excitations(h.across, func(int) int { return r.line(b, 0) }, b)
	if err != nil {
		return err
	}
	for j, ex := range exs {
		r.add(eem.Scan{Ex: ex, Em: axis, F: o.apply(r.col(b, j+1, h.from)), Line: r.line(b, h.from)}, sample)
	}
	return nil
}

// gridAcross reads a grid with emissions in the first row.
func (r *reader) gridAcross(b *block, h *gridHead, sample string) error {
	em := append([]float64(nil), h.across...)
	r.toNM(em, wavenumberWord.Match(h.corner))
	axis, o, err := r.axis(em, func(int) int { return r.line(b, 0) })
	if err != nil {
		return err
	}
	exs, err := r.excitations(r.col(b, 0, h.from), func(i int) int { return r.line(b, i+h.from) }, b)
	if err != nil {
		return err
	}
	for i, ex := range exs {
		f := append([]float64(nil), r.rowCells(b, i+h.from)[1:1+len(em)]...)
		r.add(eem.Scan{Ex: ex, Em: axis, F: o.apply(f), Line: r.line(b, i+h.from)}, sample)
	}
	return nil
}

// excitations checks a list of excitations.
func (r *reader) excitations(v []float64, line func(int) int, b *block) ([]float64, error) {
	v = append([]float64(nil), v...)
	r.toNM(v, false)
	for i, x := range v {
		if !(x >= lowestNM && x <= highestNM) {
			if math.IsNaN(x) {
				return nil, errorf(r.name, line(i), "no excitation for this row; fill it in, or take the row out")
			}
			return nil, errorf(r.name, line(i), "excitation %g nm is no wavelength of a fluorometer (%d to %d nm)", x, lowestNM, highestNM)
		}
	}
	return v, nil
}
