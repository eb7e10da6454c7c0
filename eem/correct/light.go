package correct

import (
	"math"

	"tarnlight/eem"
)

// NoLight says whether the scans show that no light came through, and why it
// thinks so: every measured cell zero or the same number.
func NoLight(e *eem.EEM) (bool, string) {
	lo, hi, n := math.Inf(1), math.Inf(-1), 0
	for i, v := range e.F {
		if measured(e, i) {
			lo, hi = min(lo, v), max(hi, v)
			n++
		}
	}
	switch {
	case n == 0:
		return true, "no cell was measured"
	case lo == 0 && hi == 0:
		return true, "every cell is zero"
	case lo == hi && n > 1:
		return true, "every cell is " + num(lo)
	}
	return false, ""
}
