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
	Water       []float64 // intensity of the blank before it is subtracted
	Blanks      int       // how many blanks the mean that samples lose is made of, 0 for none
	ID          string    // the blank it is taken from
}

// bareNoise takes it from the first blank whose noise is known.
func (s *Survey) bareNoise() *BareNoise {
	for _, b := range s.Bottles {
		if b.Row.Kind != survey.Blank || !b.Usable() || b.noise == nil || b.raw == nil || b.gain == nil {
			continue
		}
		by := b.perScale()
		onGrid := func(at func(i int) float64) []float64 {
			f := make([]float64, len(b.raw.F))
			for i := range f {
				f[i] = at(i)
			}
			return eem.FromCells(b.raw.Grid, s.Unit, f).Regrid(s.Grid).F
		}
		return &BareNoise{ID: b.Row.ID, Blanks: s.blanksASample(),
			Read2: onGrid(func(i int) float64 { return math.Pow(b.noise.Read*by*float64(b.gain[i]), 2) }),
			Shot:  onGrid(func(i int) float64 { return b.noise.Shot * by * float64(b.gain[i]) }),
			Water: onGrid(func(i int) float64 { return by * b.raw.F[i] })}
	}
	return nil
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
