package unmix_test

import (
	"math"
	"testing"

	"tarnlight/unmix"
)

// The factor k is 2, and Student's t of JCGM 100:2008, table G.2 (95 %: 3.18 and 4.30
// for 3 and 2 degrees of freedom) where the interval is made with that.
func TestExpandedOf(t *testing.T) {
	for _, c := range []struct{ value, u, lower, upper, want float64 }{
		{10, 1, 10 - 1.96, 10 + 1.96, 2},
		{10, 1, 10 - 3.18, 10 + 3.18, 3.18},
		{0.0949, 0.0035, 0.0949 - 4.30*0.0035, 0.0949 + 4.30*0.0035, 4.30 * 0.0035},
		{1, 1, 0, 2.7, 2},   // cut at zero: the upper side
		{1, 1, 0, 3.5, 2.5}, // and further than 2 u
		{3, 1, 0.2, 5, 2.8}, // skew towards zero
		{3, 1, math.NaN(), math.NaN(), 2},
	} {
		if got := unmix.ExpandedOf(c.value, c.u, c.lower, c.upper); math.Abs(got-c.want) > 1e-12 {
			t.Errorf("%+v: %g", c, got)
		}
	}
	if got := unmix.ExpandedOf(1, math.NaN(), math.NaN(), math.NaN()); !math.IsNaN(got) {
		t.Errorf("unknown u: %g", got)
	}
}
