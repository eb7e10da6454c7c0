package merit

import (
	"fmt"
	"math"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Yardstick is what noise itself looks like in this survey. Scanned spectra have
// noise whose neighbours are alike (slit, smoothing, a lamp that flickers); the noise
// model of the blanks knows only its size. Where bottles were measured twice, the
// difference of their residuals is noise and nothing else.
type Yardstick struct {
	Pairs     int     // of replicates; 0: the noise model alone
	Structure float64 // mean standard score of Moran's I of the differences
	Variance  float64 // mean variance of the differences over that of the noise model
}

// NewYardstick compares the residuals of pairs of rows that hold the same water. What
// is wrong with references and blanks is the same in both and drops out.
func NewYardstick(c *eem.Cube, r *unmix.Resolution, pairs [][2]int) *Yardstick {
	y := &Yardstick{}
	a, b := make([]float64, c.Cells()), make([]float64, c.Cells())
	for _, p := range pairs {
		if !r.Fits[p[0]].Usable || !r.Fits[p[1]].Usable {
			continue
		}
		r.ResidualTo(a, c.Sample(p[0]), p[0])
		r.ResidualTo(b, c.Sample(p[1]), p[1])
		ua, ub := c.SampleU(p[0]), c.SampleU(p[1])
		ss, want := 0.0, 0.0
		for i := range a {
			a[i] -= b[i]
			if a[i] == a[i] && ua != nil && ub != nil {
				ss += a[i] * a[i]
				want += float64(ua[i])*float64(ua[i]) + float64(ub[i])*float64(ub[i])
			}
		}
		if z := MoranI(a, c.Ex.Len(), c.Em.Len()).Z; z == z {
			y.Pairs++
			y.Structure += z
			y.Variance += ss / want
		}
	}
	if y.Pairs == 0 {
		return &Yardstick{Variance: math.NaN()}
	}
	y.Structure /= float64(y.Pairs)
	y.Variance /= float64(y.Pairs)
	return y
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
	return fmt.Sprintf("differences of %d pairs of replicates", y.Pairs)
}

// text is the yardstick for a message.
func (y *Yardstick) text() string {
	if y == nil || y.Pairs == 0 {
		return "yardstick: the noise model, which takes neighbours for independent (there are no replicates)"
	}
	text := fmt.Sprintf("yardstick: %s, their structure Z %s", y, digits(y.Structure, 2))
	if y.Variance == y.Variance {
		text += fmt.Sprintf(" and their variance %s times that of the noise model", digits(y.Variance, 3))
	}
	return text
}
