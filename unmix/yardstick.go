package unmix

import (
	"math"

	"tarnlight/eem"
)

// Yardstick is what noise itself looks like in this survey. Scanned spectra have
// noise whose neighbours are alike (slit, smoothing, a lamp that flickers); the noise
// model of the blanks knows only its size. Where bottles were measured twice, the
// difference of their residuals is noise and nothing else.
type Yardstick struct {
	Pairs     int     `json:"pairs"`              // of replicates; 0: the noise model alone
	Structure float64 `json:"structure"`          // mean standard score of Moran's I of the differences
	Variance  float64 `json:"variance,omitempty"` // mean variance of the differences over that of the noise model; 0 unknown
}

// Score is by how many standard deviations the structure z of a residual exceeds that
// of the replicate differences, each of which scatters by 1 as z does; z itself where
// there are none. Differences that are less alike than noise are no yardstick.
func (y *Yardstick) Score(z float64) float64 {
	if y == nil || y.Pairs == 0 {
		return z
	}
	return (z - math.Max(0, y.Structure)) / math.Sqrt(1+1/float64(y.Pairs))
}

// String says what the residuals are held against.
func (y *Yardstick) String() string {
	if y == nil || y.Pairs == 0 {
		return "noise model"
	}
	return "differences of " + eem.Count(y.Pairs, "pair") + " of replicates"
}
