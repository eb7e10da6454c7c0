package correct_test

import (
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// TestTemperature: a probe that loses 1 % per °C of its intensity at 25 °C reads
// 90 at 35 °C and 110 at 15 °C where it would read 100 at 25 °C.
func TestTemperature(t *testing.T) {
	g := grid(t, []float64{350}, []float64{450})
	for celsius, f := range map[float64]float64{35: 90, 25: 100, 15: 110} {
		out := correct.Temperature(eem.FromCells(g, eem.Raman, []float64{f}), celsius, 25, -0.01)
		near(t, "at 25 °C", out.F[0], 100, 1e-14)
	}
}
