package optics_test

import (
	"fmt"

	"tarnlight/eem"
	"tarnlight/eem/optics"
)

func ExampleAbsorption() {
	nm, _ := eem.Steps(240, 700, 1)
	a := &eem.Absorbance{Axis: nm, A: make([]float64, nm.Len()), PathCM: 1}
	for i := range a.A {
		a.A[i] = 0.150 * (700 - nm.At(i)) / (700 - 254)
	}
	for _, ix := range optics.Absorption(a, 4) {
		if ix.Name == "suva254" || ix.Name == "e2_e3" {
			fmt.Printf("%s %.3f %s\n", ix.Name, ix.Value, ix.Unit)
		}
	}
	// Output:
	// suva254 3.750 L mg⁻¹ m⁻¹
	// e2_e3 1.343
}
