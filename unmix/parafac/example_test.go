package parafac_test

import (
	"context"
	"fmt"

	"tarnlight/eem/synth"
	"tarnlight/unmix/parafac"
)

// Three components from 24 simulated samples, and how near the scores are to the
// truth.
func ExampleFit() {
	cube, _ := synth.Trilinear(synth.TrilinearSpec{Samples: 24, Components: 3, Noise: 0.001, Scatter: true, Seed: 3})
	r, err := parafac.Fit(context.Background(), cube, 3, &parafac.Settings{Starts: 4})
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(r.Status)
	fmt.Printf("%d components, %d samples, %.1f %% explained\n", r.Components, len(r.IDs), r.Explained)
	// Output:
	// converged
	// 3 components, 24 samples, 100.0 % explained
}

// How many components do the data bear?
func ExampleChoose() {
	cube, _ := synth.Trilinear(synth.TrilinearSpec{Samples: 24, Components: 2, Noise: 0.01, Scatter: true, Seed: 3})
	c, err := parafac.Choose(context.Background(), cube, 1, 3, &parafac.Settings{Starts: 2}, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(c.Components)
	// Output:
	// 2
}
