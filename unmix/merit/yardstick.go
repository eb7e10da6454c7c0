package merit

import (
	"fmt"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// NewYardstick compares the residuals of pairs of rows that hold the same water. What
// is wrong with references and blanks is the same in both and drops out.
func NewYardstick(c *eem.Cube, r *unmix.Resolution, pairs [][2]int) *unmix.Yardstick {
	y := &unmix.Yardstick{}
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
		if z := MoranI(a, c.Ex.Len(), c.Em.Len()).Z; z == z && !(ss < roundingOfNoise*want) {
			y.Pairs++
			y.Structure += z
			y.Variance += ss / want
		}
	}
	if y.Pairs == 0 {
		return y
	}
	y.Structure /= float64(y.Pairs)
	if y.Variance /= float64(y.Pairs); y.Variance != y.Variance {
		y.Variance = 0
	}
	return y
}

// heldAgainst is the yardstick for a message.
func heldAgainst(y *unmix.Yardstick) string {
	if y == nil || y.Pairs == 0 {
		return "yardstick: the noise model, which takes neighbours for independent (there are no replicates)"
	}
	text := fmt.Sprintf("yardstick: %s, their structure Z %s", y, digits(y.Structure, 2))
	if y.Variance > 0 {
		text += fmt.Sprintf(" and their variance %s times that of the noise model", digits(y.Variance, 3))
	}
	return text
}
