package merit

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// loading is a noisy spectrum of an unknown: v has its maximum at 1 and, by wavelength,
// info says what the cells know of it, one over the variance of noise. v is what they
// say times info/(info + ridge), which keeps small what hardly any cell shows.
type loading struct {
	v, info []float64
	ridge   float64
}

// measured is what the cells alone say at i: a peak must not be drawn to where the
// noise is less.
func (l *loading) measured(i int) float64 {
	if !(l.info[i] > 0) {
		return l.v[i]
	}
	return l.v[i] * (1 + l.ridge/l.info[i])
}

// peak returns where a spectrum is highest, nm, and the standard error of that by
// noise: of the band (see bandFit) that fits it around there, over the stretch above a
// quarter of the maximum, or a shorter one where the spectrum has more structure than
// a band and its noise. It is the plain maximum, its standard error NaN, where the
// stretch gets shorter than six points or does not hold that.
func (l *loading) peak(a eem.Axis) (nm, u float64) {
	top := floats.MaxIdx(l.v)
	smooth := averaged(l.v, max(1, len(l.v)/32))
	centre := floats.MaxIdx(smooth)
	for _, share := range []float64{0.25, 0.5, 0.65, 0.8, 0.9} {
		lo, hi := centre, centre
		for lo > 0 && smooth[lo-1] > share*smooth[centre] {
			lo--
		}
		for hi+1 < len(l.v) && smooth[hi+1] > share*smooth[centre] {
			hi++
		}
		if hi-lo < 5 || top < lo || top > hi {
			break
		}
		b, ok := l.fit(a, smooth, lo, hi)
		if ok && b.spread <= 1.5*roughness(b.left) {
			return b.nm, b.u
		}
	}
	return a.At(top), math.NaN()
}

// averaged is the moving mean of 2n+1 points, fewer at the ends.
func averaged(v []float64, n int) []float64 {
	out := make([]float64, len(v))
	for i := range v {
		lo, hi := max(0, i-n), min(len(v), i+n+1)
		out[i] = stat.Mean(v[lo:hi], nil)
	}
	return out
}

// roughness is the standard deviation of the noise of a smooth spectrum, from its
// third differences, which noise makes √20 times as large.
func roughness(v []float64) float64 {
	var d []float64
	for i := 3; i < len(v); i++ {
		d = append(d, math.Abs(v[i]-3*v[i-1]+3*v[i-2]-v[i-3]))
	}
	if d == nil {
		return 0
	}
	slices.Sort(d)
	const median = 0.6744897501960817 // of |z|
	return d[len(d)/2] / median / math.Sqrt(20)
}

// bandTerms are those of a cubic.
const bandTerms = 4

// bandFit is a spectrum fitted by the exponential of a cubic in wavenumbers: a
// Gaussian band (its logarithm is a parabola: Caruana et al. 1986, Anal. Chem. 58,
// 1162) that may be skew, as the log-normal form of emission bands is (Siano & Metzler
// 1969, J. Chem. Phys. 51, 1856; both from memory).
type bandFit struct {
	nm, u  float64   // of its maximum: place and standard error
	left   []float64 // by point, over the noise of each
	spread float64   // standard deviation of left
}

// fit fits points lo to hi, each by its information, by Gauss–Newton from a smoothed
// spectrum: the logarithm is fitted with weights height²·info (Guo 2011, IEEE Signal
// Process. Mag. 28 (5), 134; from memory). The standard error grows with what is left
// where that is more than noise (Birge 1932, Phys. Rev. 40, 207; from memory). It says
// false where the band has no maximum between the ends.
func (l *loading) fit(a eem.Axis, smooth []float64, lo, hi int) (b bandFit, ok bool) {
	const rounds, settled = 50, 1e-9
	n := hi - lo + 1
	first, width := 1/a.At(lo), (1/a.At(hi)-1/a.At(lo))/2
	rows, log := make([][]float64, n), make([]float64, n)
	for i := range rows {
		x := (1/a.At(lo+i)-first)/width - 1
		rows[i], log[i] = []float64{1, x, x * x, x * x * x}, math.Log(smooth[lo+i])
	}
	var c, inv []float64
	for range rounds {
		gram, rhs := make([]float64, bandTerms*bandTerms), make([]float64, bandTerms)
		for i, row := range rows {
			height := math.Exp(log[i])
			w := l.info[lo+i] * height * height
			addOuter(gram, row, w)
			axpy(w*(log[i]+l.measured(lo+i)/height-1), row, rhs)
		}
		if inv = inverse(gram, bandTerms, all(bandTerms)); inv == nil {
			return b, false
		}
		c = make([]float64, bandTerms)
		for t := range c {
			c[t] = floats.Dot(inv[t*bandTerms:(t+1)*bandTerms], rhs)
		}
		moved := 0.0
		for i, row := range rows {
			const far = 10 // e¹⁰ is as good as none
			is := min(max(floats.Dot(row, c), -far), far)
			moved, log[i] = max(moved, math.Abs(is-log[i])), is
		}
		if moved < settled {
			break
		}
	}
	x, curve, ok := summit(c)
	if !ok {
		return b, false
	}
	for i := range rows {
		b.left = append(b.left, (l.measured(lo+i)-math.Exp(log[i]))*math.Sqrt(l.info[lo+i]))
	}
	b.spread = floats.Norm(b.left, 2) / math.Sqrt(float64(n-bandTerms))
	b.nm = 1 / (first + (x+1)*width)
	slope := []float64{0, 1, 2 * x, 3 * x * x} // of the cubic at x, by coefficient
	b.u = math.Sqrt(form(inv, slope)) / curve * math.Abs(width) * b.nm * b.nm * max(1, b.spread)
	return b, true
}

// summit is where a cubic on −1 … 1 is highest, and its curvature there; false where
// that is an end.
func summit(c []float64) (x, curve float64, ok bool) {
	root := math.Sqrt(c[2]*c[2] - 3*c[1]*c[3])
	x = c[1] / (root - c[2])
	if !(root > 0 && math.Abs(x) < 1) {
		return 0, 0, false
	}
	at := func(x float64) float64 { return ((c[3]*x+c[2])*x + c[1]) * x }
	return x, 2 * root, at(x) > max(at(-1), at(1))
}

// Place tells where the unknown peaks, with the standard errors where they are known.
func (u *Unknown) Place() string {
	one := func(nm, u float64) string {
		if !(u > 0) {
			return eem.NM(nm)
		}
		return fmt.Sprintf("%.1f ± %.1f", nm, max(u, 0.1))
	}
	return "ex " + one(u.ExNM, u.ExU) + " / em " + one(u.EmNM, u.EmU) + " nm"
}
