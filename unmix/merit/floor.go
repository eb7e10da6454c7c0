package merit

import (
	"math"
	"slices"
)

// CauseFloor is the name of what non-negativity does to resolved loadings.
const CauseFloor = "loadings cut at zero"

// halfNormal is the mean of what is left of noise of standard deviation 1 when its
// negative half is cut to zero: 1/√(2π).
const halfNormal = 0.3989422804014327

// floors adds what the covariance of loadings does not hold, since it is that of the
// loadings above zero: where a spectrum is zero its loadings are noise without its
// negative half, all of them too high together. The effect of each component and mode
// is [h][g], as of one unknown that is off by the mean of that noise.
func (m *mask) floors(e *engine) {
	n := e.n
	hx, hm := m.modeGrams(e)
	for g := range e.r.Set.Components {
		c := &e.r.Set.Components[g]
		for _, mode := range []struct{ v, u, grams []float64 }{{c.Ex, c.ExU, hx}, {c.Em, c.EmU, hm}} {
			s := typical(mode.u)
			if s == 0 {
				continue
			}
			effect := make([]float64, n*n)
			for i, v := range mode.v {
				if !(v <= s) {
					continue
				}
				for h := range n {
					effect[h*n+g] += halfNormal * s * mode.grams[(i*n+h)*n+g]
				}
			}
			m.floor = append(m.floor, effect)
		}
	}
}

// typical is the median of what is above zero, 0 where nothing is.
func typical(u []float64) float64 {
	var v []float64
	for _, x := range u {
		if x > 0 && !math.IsInf(x, 1) {
			v = append(v, x)
		}
	}
	if v == nil {
		return 0
	}
	slices.Sort(v)
	return v[len(v)/2]
}
