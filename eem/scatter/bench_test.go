package scatter_test

import (
	"testing"

	"tarnlight/eem/scatter"
)

func BenchmarkMaskFill(b *testing.B) {
	e := fill(steps(b, 240, 465, 5), steps(b, 250, 550, 2), func(ex, em float64) float64 { return ex * em })
	for b.Loop() {
		scatter.Fill(scatter.Mask(e, halfWidth10), scatter.Interpolate)
	}
}
