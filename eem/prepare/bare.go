package prepare

import (
	"math"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// BareNoise is the noise of a cell on the survey's grid and in its unit, J × K, for a
// liquid that absorbs nothing: the variance is Read2 + Shot·(intensity before the
// blank is subtracted). NaN where it is not known.
type BareNoise struct {
	Read2, Shot []float64
	Water       []float64 // intensity of the blank before it is subtracted; nil where no blank is known
	Blanks      int       // how many blanks the mean that samples lose is made of, 0 for none
	ID          string    // the bottle whose cells it is taken from
}

// bareNoise takes it from the first blank whose noise is known; without blanks from
// the bottle with the smallest inner filter.
func (s *Survey) bareNoise() *BareNoise {
	var from *Bottle
	for _, b := range s.Bottles {
		if !b.Usable() || b.noise == nil || b.raw == nil || b.gain == nil {
			continue
		}
		if b.Row.Kind == survey.Blank {
			from = b
			break
		}
		if from == nil || innerOf(b) < innerOf(from) {
			from = b
		}
	}
	if from == nil {
		return nil
	}
	by, n := from.perScale(), from.noise
	out := &BareNoise{ID: from.Row.ID, Blanks: s.blanksASample(),
		Read2: s.cellsOf(from, func(i int) float64 { return math.Pow(n.Read*by*float64(from.gain[i]), 2) }),
		Shot:  s.cellsOf(from, func(i int) float64 { return n.Shot * by * float64(from.gain[i]) })}
	if from.Row.Kind == survey.Blank {
		out.Water = s.cellsOf(from, func(i int) float64 { return by * from.raw.F[i] })
	}
	return out
}

// innerOf is the largest factor of a bottle's inner filter, 1 where there is none.
func innerOf(b *Bottle) float64 {
	if b.Largest > 1 {
		return b.Largest
	}
	return 1
}

// cellsOf brings a map on the cells of b's raw EEM to the survey's grid.
func (s *Survey) cellsOf(b *Bottle, at func(i int) float64) []float64 {
	f := make([]float64, len(b.raw.F))
	for i := range f {
		f[i] = at(i)
	}
	return s.onGrid(eem.FromCells(b.raw.Grid, s.Unit, f)).F
}

// blanksASample is how many blanks the first usable sample lost the mean of.
func (s *Survey) blanksASample() int {
	for _, b := range s.Bottles {
		if b.Row.Kind == survey.Sample && b.Usable() {
			if b.BlankSet == "" {
				return 0
			}
			return len(b.blanks)
		}
	}
	return 0
}

// Geometry is the one of the inner filter that the settings state; ok is false where
// they have it off.
func Geometry(c survey.Correct) (g correct.Geometry, ok bool) {
	return geometry(c), c.InnerFilter != "none"
}
