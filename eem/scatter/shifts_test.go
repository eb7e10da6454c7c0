package scatter_test

import (
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/eem/synth"
)

// TestAutoShifts: outside the band found on pure water less is left of the Raman
// line than three standard deviations of the noise, at every excitation, and the
// band is no wider than five widths of the line.
func TestAutoShifts(t *testing.T) {
	for _, bandpass := range []float64{2, 3, 6} {
		in := unclipped()
		in.Bandpass = [2]float64{bandpass, bandpass}
		e, clean := scan(in, synth.Liquid{}, 6), in.Scan(synth.Liquid{}, nil)
		ps := scatter.Ridge(e, scatter.Raman1, 25)
		b, ok := scatter.AutoShifts(ps, scatter.Raman1, eem.Raman1)
		if s, _ := scatter.Offset(ps); !ok || b.Below+b.Above > 4*s.Width {
			t.Fatalf("bandpass %g: %+v (%v)", bandpass, b, ok)
		}
		t.Logf("bandpass %g nm: %g nm below 3070 and %g nm above 3650 cm⁻¹", bandpass, b.Below, b.Above)
		for j := range e.Ex.Len() {
			_, hi := b.Range(e.Ex.At(j))
			if !e.Em.Covers(hi + 1) {
				continue
			}
			k := e.Em.Nearest(hi + 1)
			if e.Em.At(k) <= hi {
				k++
			}
			if left := clean.At(j, k) - in.Offset; left > 3*in.Read+3 {
				t.Errorf("bandpass %g, ex %g: %.1f counts left at em %g", bandpass, e.Ex.At(j), left, e.Em.At(k))
			}
		}
	}
}
