package scanfile

import (
	"math"
	"slices"
	"sort"

	"tarnlight/eem"
)

// sameNM is how near two wavelengths, nm, are the same point: the tolerance of
// eem.Axis, below which an axis could not tell them apart.
const sameNM = 1e-4

// Wavelengths, nm, outside of which a column cannot be meant as a wavelength.
const lowestNM, highestNM = 100, 5000

// order brings wavelengths into increasing order. idx is nil where they were so
// already; otherwise point i of the result is the mean of the points
// idx[at[i]:at[i+1]] of the input.
type order struct {
	nm       []float64
	idx, at  []int
	unsorted bool // neither increasing nor decreasing
	repeated int  // points that stood twice
}

// newOrder finds the order of nm, which it does not change. Values must be finite.
func newOrder(nm []float64) order {
	up, down, apart := true, true, true
	for i := 1; i < len(nm); i++ {
		d := nm[i] - nm[i-1]
		up = up && d >= -sameNM
		down = down && d <= sameNM
		apart = apart && math.Abs(d) > sameNM
	}
	if up && apart {
		return order{nm: nm}
	}
	o := order{unsorted: !up && !down, idx: make([]int, len(nm))}
	for i := range o.idx {
		o.idx[i] = i
	}
	sort.SliceStable(o.idx, func(a, b int) bool { return nm[o.idx[a]] < nm[o.idx[b]] })
	for i, k := range o.idx {
		if n := len(o.nm); n > 0 && nm[k]-o.nm[n-1] <= sameNM {
			o.repeated++
			continue
		}
		o.nm = append(o.nm, nm[k])
		o.at = append(o.at, i)
	}
	o.at = append(o.at, len(nm))
	return o
}

// apply reorders one scan's intensities; repeated points become the mean of the
// numbers there are.
func (o *order) apply(f []float64) []float64 {
	if o.idx == nil {
		return f
	}
	out := make([]float64, len(o.nm))
	for i := range out {
		same := o.idx[o.at[i]:o.at[i+1]]
		if len(same) == 1 {
			out[i] = f[same[0]]
			continue
		}
		sum, n := 0.0, 0
		for _, k := range same {
			if f[k] == f[k] {
				sum += f[k]
				n++
			}
		}
		out[i] = sum / float64(n) // 0/0 is NaN: missing
	}
	return out
}

// axis makes the axis of one scan, or of all scans of a grid, from a column of
// wavelengths and notes what had to be done to it. line gives the line of point i.
func (r *reader) axis(nm []float64, line func(int) int) (eem.Axis, order, error) {
	for i, v := range nm {
		switch {
		case math.IsNaN(v):
			return eem.Axis{}, order{}, errorf(r.name, line(i), "no wavelength in this row; fill it in, or take the row out")
		case v < lowestNM || v > highestNM:
			return eem.Axis{}, order{}, errorf(r.name, line(i), "%g nm is no wavelength of a fluorometer or spectrophotometer (%d to %d nm); is this the column of wavelengths?", v, lowestNM, highestNM)
		}
	}
	o := newOrder(nm)
	if len(o.nm) < 2 {
		return eem.Axis{}, o, errorf(r.name, line(0), "only %d wavelength; a scan or spectrum needs two or more", len(o.nm))
	}
	a, err := eem.NewAxis(o.nm)
	if err != nil {
		return a, o, errorf(r.name, line(0), "%w; repair the wavelengths", err)
	}
	if o.unsorted {
		r.unsorted++
	}
	r.repeated += o.repeated
	return a, o, nil
}

// toNM converts wavenumbers, 1/cm, to nm in place where the header says so or
// every value can only be one.
func (r *reader) toNM(v []float64, said bool) {
	if !said {
		all := false
		for _, x := range v {
			if x == x && x <= wavenumberAbove {
				return
			}
			all = all || x == x
		}
		if !all {
			return
		}
	}
	for i, x := range v {
		if x != 0 {
			v[i] = nmPerInvCM / x
		}
	}
	r.wavenumbers = true
}

// monotonic says whether the values, NaN at the end left out, increase or
// decrease strictly.
func monotonic(v []float64) bool {
	for len(v) > 0 && math.IsNaN(v[len(v)-1]) {
		v = v[:len(v)-1]
	}
	if len(v) < 2 || slices.ContainsFunc(v, math.IsNaN) {
		return false
	}
	up := v[1] > v[0]
	for i := 1; i < len(v); i++ {
		if v[i] == v[i-1] || (v[i] > v[i-1]) != up {
			return false
		}
	}
	return true
}
