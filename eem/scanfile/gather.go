package scanfile

import (
	"math"
	"slices"

	"tarnlight/eem"
)

// maxScans bounds the scans of one file.
const maxScans = 200_000

// longScan is the rows of one scan.
type longScan struct {
	ex    float64
	label string
	n     int
	em, f []float64
	lines []int32
}

// long gathers the rows of a long table by sample and excitation.
func (r *reader) long(blocks []block, l longColumns) error {
	scans, of, err := r.longKeys(blocks, l)
	if err != nil {
		return err
	}
	em, f, lines := make([]float64, len(of)), make([]float64, len(of)), make([]int32, len(of))
	at := 0
	for i := range scans {
		s := &scans[i]
		s.em, s.f, s.lines = em[at:at:at+s.n], f[at:at:at+s.n], lines[at:at:at+s.n]
		at += s.n
	}
	row := 0
	for i := range blocks {
		for k := range blocks[i].rows {
			if of[row] >= 0 {
				s, c := &scans[of[row]], r.rowCells(&blocks[i], k)
				s.em, s.f, s.lines = append(s.em, c[l.em]), append(s.f, c[l.f]), append(s.lines, int32(r.line(&blocks[i], k)))
			}
			row++
		}
	}
	said := func(c int) bool { return len(l.head) > c && wavenumberWord.Match(l.head[c]) }
	return r.longScans(scans, said(l.ex), said(l.em))
}

// longKeys finds the scan that each row belongs to, −1 for a row of blanks.
func (r *reader) longKeys(blocks []block, l longColumns) (scans []longScan, of []int32, err error) {
	type key struct{ ex, label float64 }
	at := map[key]int32{}
	last, cur := key{math.NaN(), 0}, int32(-1)
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
				of = append(of, -1)
				continue
			case id.ex != id.ex:
				return nil, nil, errorf(r.name, r.line(b, k), "no excitation in this row; fill it in, or take the row out")
			case id != last:
				var ok bool
				if cur, ok = at[id]; !ok {
					if len(scans) == maxScans {
						return nil, nil, errorf(r.name, r.line(b, k), "more than %d different excitations; is this the excitation column? Write ex_nm, em_nm, intensity above the columns", maxScans)
					}
					cur = int32(len(scans))
					at[id] = cur
					s := longScan{ex: id.ex}
					if l.label >= 0 {
						s.label = r.rows.labels[int(id.label)]
					}
					scans = append(scans, s)
				}
				last = id
			}
			scans[cur].n++
			of = append(of, cur)
		}
	}
	return scans, of, nil
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
