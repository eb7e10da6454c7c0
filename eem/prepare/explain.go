package prepare

// Blanks returns the blanks that the bottle's own blank and scale rest on.
func (b *Bottle) Blanks() []*Bottle { return b.blanks }

// Scale returns what the bottle's intensities were divided by, NaN where they
// stayed as they were.
func (b *Bottle) Scale() float64 { return b.scale }

// Corrected says whether a bottle's emission is spectrally corrected and whether its
// inner filter is, here or before the files came here.
func (s *Survey) Corrected(b *Bottle) (spectral, inner bool) {
	spectral = b.done(stepSpectral) || s.factors[b.Row.Setup].em != nil && !b.off(stepSpectral)
	inner = b.done(stepInner) || b.Absorb != nil && b.Setting.Correct.InnerFilter != "none" && !b.off(stepInner)
	return spectral, inner
}
