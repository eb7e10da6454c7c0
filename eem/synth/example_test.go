package synth_test

import (
	"fmt"
	"math"

	"tarnlight/eem/synth"
)

// Brown water weakens the light of what is dissolved in it; the centre form of
// the inner-filter correction brings it back.
func ExampleInstrument_Scan() {
	in := synth.NewInstrument()
	in.Offset = 0
	tryptophan := synth.Dose{Of: synth.Substance("tryptophan"), Amount: 100} // µg/L
	clear := synth.Liquid{Doses: []synth.Dose{tryptophan}}
	brown := clear
	brown.Color = synth.Tail{At254: 0.3, Slope: 0.015}

	c, b := in.Scan(clear, nil).Interp(280, 352), in.Scan(brown, nil).Interp(280, 352)
	factor := func(l synth.Liquid) float64 { return math.Pow(10, (l.AbsorbanceAt(280)+l.AbsorbanceAt(352))/2) }
	fmt.Printf("counts: clear %.0f, brown %.0f\n", c, b)
	fmt.Printf("corrected: clear %.0f, brown %.0f\n", c*factor(clear), b*factor(brown))
	// Output:
	// counts: clear 31347, brown 22926
	// corrected: clear 31445, brown 31458
}
