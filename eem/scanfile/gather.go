package scanfile

import (
	"math"
	"slices"

	"tarnlight/eem"
)

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
