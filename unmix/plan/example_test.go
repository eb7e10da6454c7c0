package plan_test

import (
	"context"
	"fmt"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/plan"
)

// Two components that emit alike and are excited apart: the best two of five scans lie
// where each of them is strong.
func Example() {
	ex, _ := eem.Steps(260, 300, 10)
	em, _ := eem.Steps(350, 390, 10)
	set := &unmix.Set{Grid: eem.Grid{Ex: ex, Em: em}, Components: []unmix.Component{
		{Name: "a", Scale: 1, Ex: []float64{.9, 1, .5, .2, 0}, Em: []float64{.3, .8, 1, .6, .2}},
		{Name: "b", Scale: 1, Ex: []float64{0, .2, .5, 1, .8}, Em: []float64{.2, .7, 1, .7, .3}},
	}}
	d, err := plan.New(plan.Problem{Set: set, Level: []float64{1, 1}, Noise: plan.Even(set.Grid.Cells(), 0.01, 0, 0)})
	if err != nil {
		fmt.Println(err)
		return
	}
	choices, err := d.Plans(context.Background(), 2, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, c := range choices {
		fmt.Printf("%d: u of a %.3f, of b %.3f, excitations", len(c.Lines), c.U[0], c.U[1])
		for _, j := range c.Lines {
			fmt.Printf(" %g", ex.At(j))
		}
		fmt.Println()
	}
	// Output:
	// 1: u of a 0.100, of b 0.101, excitations 280
	// 2: u of a 0.007, of b 0.007, excitations 270 290
}
