package optics

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// region is one of five parts of the plane of excitation and emission, nm.
type region struct {
	name, like string
	ex0, ex1   float64
	em0, em1   float64
}

// The regions of Chen et al. 2003, Environ. Sci. Technol. 37, 5701 (limits from
// memory).
var regions = []region{
	{"region_1", "tyrosine-like", 200, 250, 280, 330},
	{"region_2", "tryptophan-like", 200, 250, 330, 380},
	{"region_3", "fulvic-like", 200, 250, 380, 550},
	{"region_4", "microbial by-product-like", 250, 400, 280, 380},
	{"region_5", "humic-like", 250, 400, 380, 550},
}

// Regions returns each region's share, %, of the intensity: the mean over the
// region's area that holds numbers, over the sum of the five means. That is the
// published normalised volume with the area factors taken from this EEM's own
// grid, as they must be. A cell counts with the part of it (half-way to its
// neighbours) that lies in the region.
func Regions(e *eem.EEM) []Index {
	out := make([]Index, len(regions))
	means := make([]float64, len(regions))
	total, refused := 0.0, ""
	for n, r := range regions {
		out[n] = Index{Name: r.name, Unit: "%", Value: math.NaN(), U: math.NaN(), Source: "Chen et al. 2003, Environ. Sci. Technol. 37, 5701 (limits from memory)",
			What: fmt.Sprintf("share of the %s region, ex %g–%g, em %g–%g nm", r.like, r.ex0, r.ex1, r.em0, r.em1)}
		sum, area, filled := r.volume(e)
		switch {
		case area == 0:
			refused = fmt.Sprintf("the EEM has no value in ex %g–%g, em %g–%g nm", r.ex0, r.ex1, r.em0, r.em1)
		case filled > MaxFilled*area:
			refused = fmt.Sprintf("%.0f %% of ex %g–%g, em %g–%g nm was filled, not measured", 100*filled/area, r.ex0, r.ex1, r.em0, r.em1)
		}
		means[n] = sum / area
		total += means[n]
	}
	if refused == "" && !(total > 0) {
		refused = "the sum over the regions is not positive"
	}
	for n := range out {
		if out[n].Refused = refused; refused == "" {
			out[n].Value = 100 * means[n] / total
		}
		out[n] = settled(out[n])
	}
	return out
}

// volume integrates over the region: Σ F·area, the area with numbers and the
// part of it that was filled.
func (r region) volume(e *eem.EEM) (sum, area, filled float64) {
	for j := range e.Ex.Len() {
		w := overlap(e.Ex, j, r.ex0, r.ex1)
		if w == 0 {
			continue
		}
		for k, v := range e.Row(j) {
			a := w * overlap(e.Em, k, r.em0, r.em1)
			if a == 0 || math.IsNaN(v) {
				continue
			}
			sum, area = sum+a*v, area+a
			if e.Why[e.Index(j, k)] != eem.Measured {
				filled += a
			}
		}
	}
	return sum, area, filled
}

// overlap is how many nm of the stretch around point i, half-way to its
// neighbours, lie in lo … hi.
func overlap(ax eem.Axis, i int, lo, hi float64) float64 {
	from, to := ax.At(i), ax.At(i)
	if i > 0 {
		from = (ax.At(i-1) + from) / 2
	}
	if i < ax.Len()-1 {
		to = (ax.At(i+1) + to) / 2
	}
	return max(0, min(hi, to)-max(lo, from))
}

// peakBoxes are where the peaks of Coble 1996 lie (from memory), with some room.
var peakBoxes = []struct {
	name               string
	ex0, ex1, em0, em1 float64
}{
	{"B, tyrosine-like", 265, 285, 295, 318},
	{"T, tryptophan-like", 265, 290, 318, 370},
	{"A, humic-like", 230, 265, 380, 480},
	{"M, humic-like", 290, 319, 370, 430},
	{"C, humic-like", 319, 370, 400, 500},
}

// Like names the common peak near a place of the plane for a message, ", like peak
// T, tryptophan-like"; empty where there is none. What glows alike need not be that.
func Like(exNM, emNM float64) string {
	for _, b := range peakBoxes {
		if exNM >= b.ex0 && exNM <= b.ex1 && emNM >= b.em0 && emNM <= b.em1 {
			return ", like peak " + b.name
		}
	}
	return ""
}
