package correct_test

import (
	"fmt"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// The chain on one scan: counts, spectral factors left out, to Raman units.
func Example() {
	ex, _ := eem.NewAxis([]float64{350})
	em, _ := eem.NewAxis([]float64{371, 397, 428, 450})
	g := eem.Grid{Ex: ex, Em: em}
	sample := eem.FromCells(g, eem.Counts, []float64{95, 180, 240, 265})
	blank := eem.FromCells(g, eem.Counts, []float64{15, 65, 15, 10})
	atEx, _ := eem.NewAxis([]float64{350, 450})
	a := &eem.Absorbance{Axis: atEx, A: []float64{0.06, 0.02}, PathCM: 1}

	sample = correct.Offset(correct.Saturate(sample, 1000), 5)
	blank = correct.Offset(correct.Saturate(blank, 1000), 5)
	sample, factor := correct.InnerFilter(sample, a, correct.Geometry{}, 0)
	area, err := correct.Areas([]*eem.EEM{blank}, 350, [2]float64{371, 428}, correct.StraightBaseline)
	if err != nil {
		fmt.Println(err)
		return
	}
	sample = correct.RamanUnits(correct.Blank(sample, blank), area, "day 1")
	fmt.Printf("inner-filter factor at em 450: %.4f\n", factor[3])
	fmt.Printf("F(350, 450) = %.4f %s\n", sample.At(0, 3), sample.Unit)
	for _, n := range sample.Notes {
		fmt.Printf("%s: %s\n", n.Step, n.Msg)
	}
	// Output:
	// inner-filter factor at em 450: 1.0965
	// F(350, 450) = 0.1966 RU
	// saturation: 0 cells at or above 1000 counts left out
	// offset: 5 counts subtracted from every cell
	// inner filter: multiplied by the factor of each cell, largest 1.1371
	// blank: blank subtracted
	// intensity scale: divided by the area of water's Raman line
}

// The window form for a detector that sees the middle 4 mm of a 1 cm cell.
func ExampleGeometry_Factor() {
	g := correct.Geometry{Form: correct.RightAngle, Ex: [2]float64{0.3, 0.7}, Em: [2]float64{0.3, 0.7}}
	fmt.Printf("%.4f, by the centre form %.4f\n", g.Factor(1, 0), correct.Geometry{}.Factor(1, 0))
	// Output: 3.0532, by the centre form 3.1623
}

func ExampleControlledDilution() {
	ex, _ := eem.NewAxis([]float64{350})
	em, _ := eem.NewAxis([]float64{450})
	g := eem.Grid{Ex: ex, Em: em}
	asIs := eem.FromCells(g, eem.Raman, []float64{44.9329})
	half := eem.FromCells(g, eem.Raman, []float64{33.5160})
	out, _ := correct.ControlledDilution(asIs, half, 2)
	fmt.Printf("%.2f\n", out.F[0])
	// Output: 100.00
}
