package merit

import (
	"math"

	"tarnlight/unmix"
)

// rounding is the share of the noise's variance, or where the noise is not known of
// the signal's mean square, up to which a residual is called what rounding left:
// a thousandth of the noise, a millionth of the signal.
const (
	roundingOfNoise  = 1e-6
	roundingOfSignal = 1e-12
)

// nothingLeft says that a fit leaves no residual that could be tested. So it is with
// a bottle that alone determines its references, such as the only standard of a
// substance: its residual is zero by construction, and tests of it would judge the
// rounding of numbers.
func nothingLeft(fit *unmix.Fit, s *Spread) bool {
	if s.ChiSquare == s.ChiSquare {
		return s.ChiSquare < roundingOfNoise
	}
	return 1-fit.Explained/100 < roundingOfSignal
}

// untested is the structure of a residual of n cells that is not tested.
func untested(n int) Moran {
	nan := math.NaN()
	return Moran{N: n, I: nan, E: nan, Z: nan, ZRandom: nan}
}
