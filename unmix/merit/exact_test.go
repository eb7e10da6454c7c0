package merit_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// A bottle that alone determines its reference leaves a residual of rounding alone:
// nothing is tested on it, with the noise known or not, however tidy the rounding
// lies. One whose residual is as small as a hundredth of the noise is still tested.
func TestNothingLeft(t *testing.T) {
	const sd = 0.02
	limit := func(string) float64 { return 4 }
	accept := func(f eem.Flag) eem.Flag { return f }
	for _, known := range []bool{true, false} {
		for _, size := range []float64{1e-15, sd / 100} {
			c, set := mixture([][]float64{{3, 0}, {2, 1}}, []float64{430, 470}, 0, 1)
			for i := range c.U {
				c.U[i] = sd
			}
			if !known {
				c.U = nil
			}
			for i, v := range c.Sample(0) { // what is left is all alike
				k := i % c.Em.Len()
				c.Sample(0)[i] = v + size*math.Sin(float64(k)/8)
			}
			r, sp := spreads(t, c, set, nil)
			j := merit.Judge(r, sp, []merit.Bottle{{ID: "S1"}}, c.Sample, limit, accept, "test")
			z := j.Structure[0].Z
			switch tested := size > 1e-10; {
			case tested && (j.Tested != 1 || !(z > 4) || len(j.Flags) == 0):
				t.Errorf("noise known %v, residual of %g: not tested, z %g, %v", known, size, z, j.Flags)
			case !tested && (j.Tested != 0 || z == z || len(j.Flags) > 0):
				t.Errorf("noise known %v, residual of %g: %d tested, z %g, %v", known, size, j.Tested, z, j.Flags)
			}
			for _, f := range j.Flags {
				if strings.Contains(f.Msg, "NaN") {
					t.Errorf("noise known %v: %s", known, f.Msg)
				}
			}
		}
	}
	var y *unmix.Yardstick
	if z := y.Score(math.NaN()); z == z {
		t.Errorf("a residual that is not tested scores %g", z)
	}
}
