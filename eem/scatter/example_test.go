package scatter_test

import (
	"fmt"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
)

func ExampleLine_Em() {
	fmt.Printf("%.1f nm\n", scatter.Raman1.Em(350))
	// Output: 397.3 nm
}

// Cut the first Rayleigh and Raman bands of one scan and fill what lies between
// measured cells.
func ExampleMask() {
	ex, _ := eem.NewAxis([]float64{350})
	em, _ := eem.Steps(340, 420, 10)
	e := eem.FromCells(eem.Grid{Ex: ex, Em: em}, eem.Counts, []float64{5, 900, 8, 6, 7, 30, 60, 8, 9})
	e = scatter.Mask(e, []scatter.Band{
		{Line: scatter.Rayleigh1, Below: 5, Above: 5, Reason: eem.Rayleigh1},
		{Line: scatter.Raman1, Below: 8, Above: 8, Reason: eem.Raman1},
	})
	e = scatter.Fill(e, scatter.Interpolate)
	for k := range em.Len() {
		fmt.Printf("%g: %.3g, %s\n", em.At(k), e.At(0, k), e.Why[k])
	}
	// Output:
	// 340: NaN, below excitation
	// 350: NaN, Rayleigh first order
	// 360: 8, measured
	// 370: 6, measured
	// 380: 7, measured
	// 390: 7.38, Raman first order
	// 400: 7.62, Raman first order
	// 410: 8, measured
	// 420: 9, measured
}
