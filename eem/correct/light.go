package correct

import (
	"math"
	"slices"

	"tarnlight/eem"
)

const (
	// lightSigma is how many standard deviations of the noise two neighbouring
	// cells must both stand above the median to be light. Of 10⁵ cells of Poisson
	// noise with mean 0.5, the most skewed dark count that shutters give, one pair
	// in 300 EEMs does.
	lightSigma = 6
	// lightCorr is the correlation of neighbouring scans that shows light: 0 for
	// noise, S²/(S²+σ²) for a signal of standard deviation S in noise σ. 0.1 is a
	// signal of a third of the noise.
	lightCorr = 0.1
	// ridgeNM is how near, nm, to the excitation a cell counts as Rayleigh line.
	ridgeNM = 10
)

// NoLight says whether the scans show that no light came through (closed
// shutter, dead lamp, empty cell) and how that shows.
//
// Every measured cell zero, or all alike, counts for any EEM. For counts whose
// Rayleigh line was scanned and not cut away, noise alone counts too: no two
// neighbouring cells stand out of it, and neighbouring scans are not alike.
// Noise is taken from second differences between three neighbouring scans,
// which are measured apart, so that smoothing along emission does not
// hide it; from one along emission where there are fewer. A blank or a very
// weak sample has its Rayleigh line and passes. Ask before the blank is
// subtracted: what is left of clean water then is noise.
func NoLight(e *eem.EEM) (bool, string) {
	var v []float64
	for i := range e.F {
		if measured(e, i) {
			v = append(v, e.F[i])
		}
	}
	if len(v) == 0 {
		return true, "no cell was measured"
	}
	switch lo, hi := slices.Min(v), slices.Max(v); {
	case lo == 0 && hi == 0:
		return true, "every cell is zero"
	case lo == hi && len(v) > 1:
		return true, "every cell is " + num(lo)
	}
	if e.Unit != eem.Counts || !ridgeScanned(e) {
		return false, ""
	}
	middle, noise := medianOf(v), scanNoise(e)
	if !(noise > 0) || standsOut(e, middle+lightSigma*noise) || scansAlike(e) {
		return false, ""
	}
	return true, "no cell stands out of the noise (median " + num(middle) + ", standard deviation " + num(noise) + " counts), not even on the Rayleigh line"
}

// ridgeScanned says whether cells on the first Rayleigh line hold numbers other
// than zero at three excitations or more, or at all of fewer.
func ridgeScanned(e *eem.EEM) bool {
	n := 0
	for j := range e.Ex.Len() {
		for k, v := range e.Row(j) {
			if math.Abs(e.Em.At(k)-e.Ex.At(j)) <= ridgeNM && measured(e, e.Index(j, k)) && v != 0 {
				n++
				break
			}
		}
	}
	return n >= min(3, e.Ex.Len())
}

// What a median absolute second difference is divided by to be a standard
// deviation.
const (
	normalMAD = 0.6744897501960817 // the upper quartile of a standard normal
	sixth     = 2.449489742783178  // √(1+4+1)
)

// scanNoise is the standard deviation of a cell's noise: the median absolute
// second difference over what a normal distribution would give, or the root
// mean square where the median is 0 (counts that are mostly alike).
func scanNoise(e *eem.EEM) float64 {
	var d []float64
	sum := 0.0
	step := e.Em.Len()
	if e.Ex.Len() < 3 {
		step = 1
	}
	for i := range e.F {
		a, b, c := i-step, i, i+step
		if a < 0 || c >= len(e.F) || (step == 1 && a/e.Em.Len() != c/e.Em.Len()) || !measured(e, a) || !measured(e, b) || !measured(e, c) {
			continue
		}
		v := e.F[a] - 2*e.F[b] + e.F[c]
		d = append(d, math.Abs(v))
		sum += v * v
	}
	if len(d) == 0 {
		return 0
	}
	if m := medianOf(d); m > 0 {
		return m / normalMAD / sixth
	}
	return math.Sqrt(sum/float64(len(d))) / sixth
}

// medianOf returns the median of v, of every n-th value where there are more
// than 2,000: the median of so many is known to 3 % of a standard deviation.
func medianOf(v []float64) float64 {
	const enough = 2000
	step := max(1, len(v)/enough)
	s := make([]float64, 0, len(v)/step+1)
	for i := 0; i < len(v); i += step {
		s = append(s, v[i])
	}
	return median(s)
}

// standsOut says whether two neighbouring cells of a scan are both above level.
// One alone may be a spike.
func standsOut(e *eem.EEM, level float64) bool {
	for j := range e.Ex.Len() {
		row := e.Row(j)
		for k := 1; k < len(row); k++ {
			if row[k] > level && row[k-1] > level && measured(e, e.Index(j, k)) && measured(e, e.Index(j, k-1)) {
				return true
			}
		}
	}
	return false
}

// scansAlike says whether neighbouring scans (cells of the one scan, where there
// is no other) rise and fall together.
func scansAlike(e *eem.EEM) bool {
	step, n := e.Em.Len(), e.Em.Len()
	if e.Ex.Len() == 1 {
		step = 1
	}
	mean := make([]float64, e.Ex.Len())
	for j := range mean {
		c := 0.0
		for k, v := range e.Row(j) {
			if measured(e, e.Index(j, k)) {
				mean[j], c = mean[j]+v, c+1
			}
		}
		mean[j] /= c
	}
	var xy, xx, yy, c float64
	for i := range e.F[:max(0, len(e.F)-step)] {
		if measured(e, i) && measured(e, i+step) {
			x, y := e.F[i]-mean[i/n], e.F[i+step]-mean[(i+step)/n]
			xy, xx, yy, c = xy+x*y, xx+x*x, yy+y*y, c+1
		}
	}
	return xy > max(lightCorr, 5/math.Sqrt(c))*math.Sqrt(xx*yy)
}
