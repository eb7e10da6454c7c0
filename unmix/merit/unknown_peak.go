package merit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// clearPeak returns the index of the maximum of a noisy spectrum: of the parabola in
// wavenumbers that fits it around there, over the stretch above half of the maximum,
// or a shorter one where the spectrum has more structure than a parabola and its
// noise. It is the plain maximum where the stretch gets shorter than six points or
// does not hold that.
func clearPeak(a eem.Axis, v []float64) int {
	top := floats.MaxIdx(v)
	if len(v) < 8 {
		return top
	}
	smooth := averaged(v, max(1, len(v)/32))
	centre := floats.MaxIdx(smooth)
	for _, share := range []float64{0.5, 0.65, 0.8, 0.9} {
		lo, hi := centre, centre
		for lo > 0 && smooth[lo-1] > share*smooth[centre] {
			lo--
		}
		for hi+1 < len(v) && smooth[hi+1] > share*smooth[centre] {
			hi++
		}
		if hi-lo < 5 || top < lo || top > hi {
			break
		}
		if at, left, ok := bandPeak(a, v, lo, hi); ok && sd(left) <= 1.5*roughness(v[lo:hi+1]) {
			return at
		}
	}
	return top
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

// peakTerms are those of a parabola.
const peakTerms = 3

// sd is the standard deviation of what the fit leaves.
func sd(left []float64) float64 {
	return floats.Norm(left, 2) / math.Sqrt(float64(len(left)-peakTerms))
}

// bandPeak fits a parabola in wavenumbers, in which bands are nearly symmetrical
// (common practice, no source), to v from lo to hi and returns where it is highest and
// what it leaves; false where that is at an end.
func bandPeak(a eem.Axis, v []float64, lo, hi int) (at int, left []float64, ok bool) {
	n := hi - lo + 1
	x := func(i int) float64 { return 2*(1/a.At(i)-1/a.At(lo))/(1/a.At(hi)-1/a.At(lo)) - 1 }
	m, rhs := mat.NewDense(n, peakTerms, nil), mat.NewVecDense(n, slices.Clone(v[lo:hi+1]))
	for i := range n {
		for t, p := 0, 1.0; t < peakTerms; t, p = t+1, p*x(lo+i) {
			m.Set(i, t, p)
		}
	}
	var c, fit mat.VecDense
	if c.SolveVec(m, rhs) != nil {
		return 0, nil, false
	}
	fit.MulVec(m, &c)
	at = floats.MaxIdx(fit.RawVector().Data)
	fit.SubVec(rhs, &fit)
	return lo + at, fit.RawVector().Data, at > 0 && at < n-1
}
