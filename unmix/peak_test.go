package unmix_test

import (
	"math"
	"testing"

	"tarnlight/unmix"
)

// The peak of a spectrum pair is where it can fluoresce; where the loadings are
// greatest elsewhere, both are told.
func TestPeak(t *testing.T) {
	ex, em := []float64{250, 300, 350, 400}, []float64{280, 330, 380, 430}
	nan := math.NaN()
	for _, c := range []struct {
		ex, em    []float64
		own, seen [2]int
	}{
		{[]float64{0.5, 1, 0.2, 0}, []float64{0.1, 0.6, 1, 0.3}, [2]int{1, 2}, [2]int{1, 2}},
		{[]float64{0.4, 0.2, 0.1, 1}, []float64{1, 0.5, 0.2, 0.3}, [2]int{3, 0}, [2]int{0, 0}}, // 0.4 at 250 / 280
		{[]float64{0.1, 0.2, 0.1, 1}, []float64{1, 0.5, 0.2, 0.3}, [2]int{3, 0}, [2]int{3, 3}}, // 0.3 at 400 / 430
		{[]float64{nan, 1, 0.2, 0}, []float64{1, nan, 0.5, 0.3}, [2]int{1, 0}, [2]int{1, 2}},
		{[]float64{nan, nan, nan, nan}, []float64{1, 1, 1, 1}, [2]int{-1, -1}, [2]int{-1, -1}},
	} {
		if own, seen := unmix.Peak(ex, em, c.ex, c.em); own != c.own || seen != c.seen {
			t.Errorf("%v × %v: own %v, seen %v, want %v and %v", c.ex, c.em, own, seen, c.own, c.seen)
		}
	}
}
