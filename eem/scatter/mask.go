package scatter

import (
	"fmt"
	"math"

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
		cuts := cutsAt(bands, e.Ex.At(j))
		for k := range e.Em.Len() {
			if why, cut := reason(cuts, e.Em.At(k)); cut {
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

// cut is a stretch of emission to leave out of one scan, nm, ends included.
type cut struct {
	lo, hi float64
	why    eem.Reason
}

// cutsAt lists what the bands take at ex nm, the space below the first Rayleigh
// line last.
func cutsAt(bands []Band, ex float64) []cut {
	var out, below []cut
	for _, b := range bands {
		lo, hi := b.Range(ex)
		out = append(out, cut{lo, hi, b.Reason})
		if b.Order == 1 && b.Shift == 0 {
			below = append(below, cut{math.Inf(-1), lo, eem.BelowExcitation})
		}
	}
	return append(out, below...)
}

// sameNM, nm, is how near two wavelengths are one, as on the axes of package eem:
// an end of a band that falls on a cell takes it, however a file rounded.
const sameNM = 1e-4

// reason says whether a cut holds em, and the first one that does.
func reason(cuts []cut, em float64) (eem.Reason, bool) {
	for _, c := range cuts {
		if em >= c.lo-sameNM && em <= c.hi+sameNM {
			return c.why, true
		}
	}
	return eem.Measured, false
}

// In returns a function that says whether a band holds a cell, for tests that must
// keep away from the lines.
func In(bands []Band) func(exNM, emNM float64) bool {
	return func(ex, em float64) bool {
		_, cut := reason(cutsAt(bands, ex), em)
		return cut
	}
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
