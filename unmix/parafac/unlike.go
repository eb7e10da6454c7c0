package parafac

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"
)

// Unlike is a sample that is not like the others.
type Unlike struct {
	Sample int
	Kind   string  // "residual": the model fits it worse; "leverage": its composition is rare
	Value  float64 // root mean square residual, cube's unit, or leverage
	Limit  float64 // of the same kind
}

// Unlike returns the samples whose residual or leverage lies above what the
// share rate of samples exceeds by chance, and how many of the fitted samples
// would in all. The limits are those of a log-normal distribution with median and
// spread (1.4826 times the median absolute deviation) of the samples themselves,
// so that a few odd ones do not hide each other. It panics unless 0 < rate < 0.5.
func (r *Result) Unlike(rate float64) (found []Unlike, byChance float64) {
	if !(rate > 0 && rate < 0.5) {
		panic("parafac: rate of chance flags must lie between 0 and 0.5")
	}
	z := distuv.UnitNormal.Quantile(1 - rate)
	n := len(r.IDs)
	rms := make([]float64, n)
	for i := range rms {
		rms[i] = math.Sqrt(r.SampleSSE[i] / float64(max(1, r.Cells[i])))
	}
	for _, k := range []struct {
		kind string
		v    []float64
	}{{"residual", rms}, {"leverage", r.Leverage}} {
		var logs []float64
		for i, v := range k.v {
			if r.Fitted[i] && v > 0 {
				logs = append(logs, math.Log(v))
			}
		}
		if len(logs) < 8 { // too few to say what is usual
			continue
		}
		byChance += rate * float64(len(logs))
		mid := median(logs)
		for i, v := range logs {
			logs[i] = math.Abs(v - mid)
		}
		limit := math.Exp(mid + z*1.4826*median(logs))
		for i, v := range k.v {
			if r.Fitted[i] && v > limit {
				found = append(found, Unlike{Sample: i, Kind: k.kind, Value: v, Limit: limit})
			}
		}
	}
	return found, byChance
}

// median sorts a copy.
func median(v []float64) float64 {
	s := slices.Clone(v)
	slices.Sort(s)
	n := len(s)
	return (s[(n-1)/2] + s[n/2]) / 2
}
