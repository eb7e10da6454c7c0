package prepare

// Blanks returns the blanks that the bottle's own blank and scale rest on.
func (b *Bottle) Blanks() []*Bottle { return b.blanks }

// Scale returns what the bottle's intensities were divided by, NaN where they
// stayed as they were.
func (b *Bottle) Scale() float64 { return b.scale }
