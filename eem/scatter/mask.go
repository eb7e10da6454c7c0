package scatter

import (
	"fmt"

	"tarnlight/eem"
)

// Mask makes the cells of the bands missing for the band's reason; where bands
// overlap the first one counts. With a band around the first Rayleigh line among
// them, cells on its short side become missing too (BelowExcitation): nothing
// fluoresces at less than the exciting wavelength. The cells depend on the grid
// alone, so that all samples on one grid lack the same ones; what they held, or
// why they held nothing, is forgotten.
func Mask(e *eem.EEM, bands []Band) *eem.EEM {
	out := e.Clone()
	var n [eem.NumReasons]int
	for j := range e.Ex.Len() {
		ex := e.Ex.At(j)
		for k := range e.Em.Len() {
			if why, cut := reason(bands, ex, e.Em.At(k)); cut {
				out.Drop(e.Index(j, k), why)
				n[why]++
			}
		}
	}
	note := eem.Note{Step: Step, Msg: "cells of the scatter bands left out"}
	for _, b := range bands {
		note.Params = append(note.Params, b.params()...)
	}
	for r := eem.BelowExcitation; r <= eem.Raman2; r++ {
		if n[r] > 0 {
			note.Params = append(note.Params, eem.Param{Name: "cells, " + r.String(), Value: fmt.Sprint(n[r]), Unit: "cells", Source: "grid"})
		}
	}
	out.Note(note)
	return out
}

// reason says whether a band, or the space below the first Rayleigh line, holds
// the cell.
func reason(bands []Band, ex, em float64) (eem.Reason, bool) {
	for _, b := range bands {
		if lo, hi := b.Range(ex); em >= lo && em <= hi {
			return b.Reason, true
		}
	}
	for _, b := range bands {
		if lo, _ := b.Range(ex); b.Order == 1 && b.Shift == 0 && em < lo {
			return eem.BelowExcitation, true
		}
	}
	return eem.Measured, false
}

// params describes the band in a note.
func (b Band) params() []eem.Param {
	name := b.Reason.String()
	if b.To > 0 {
		return []eem.Param{{Name: name + ", shifts", Value: num(b.From) + "–" + num(b.To), Unit: "cm⁻¹", Source: "settings"},
			{Name: name + ", below/above", Value: num(b.Below) + "/" + num(b.Above), Unit: "nm", Source: "settings"}}
	}
	p := []eem.Param{{Name: name + ", below/above", Value: num(b.Below) + "/" + num(b.Above), Unit: "nm", Source: "settings"}}
	if b.Shift > 0 {
		p = append(p, eem.Param{Name: name + ", shift", Value: num(b.Shift), Unit: "cm⁻¹", Source: "convention"})
	}
	return p
}
