package merit

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

// Limits are the three limits of detection in one unit: above Critical a component
// is there, what holds Detection exceeds that with 95 % probability, and at
// Quantification the standard uncertainty is a tenth.
type Limits struct{ Critical, Detection, Quantification float64 }

// Currie gives the limits for a known standard deviation s0 of the net signal of a
// blank: 1.645, 3.29 and 10 s0 (Currie 1968, Anal. Chem. 40, 586; from memory).
func Currie(s0 float64) Limits {
	return Limits{kCritical * s0, kDetect * s0, kQuantify * s0}
}

// CurrieCounts gives the limits of a count above a paired background of B counts:
// k√(2B), k² + 2k√(2B), 50(1 + √(1 + 2B/25)) (Currie 1968).
func CurrieCounts(background float64) Limits {
	root := math.Sqrt(2 * background)
	return Limits{kCritical * root, kCritical*kCritical + 2*kCritical*root, 50 * (1 + math.Sqrt(1+2*background/25))}
}

// Delta returns δ(ν; α, β), the non-centrality at which a non-central t with nu
// degrees of freedom stays below the central t's 1−alpha point with probability
// beta (ISO 11843-2, definition from memory). It is z_α + z_β for infinite nu.
func Delta(nu, alpha, beta float64) float64 {
	za, zb := distuv.UnitNormal.Quantile(1-alpha), distuv.UnitNormal.Quantile(1-beta)
	if math.IsInf(nu, 1) || !(nu > 0) || nu > 1e5 {
		return za + zb
	}
	t := TQuantile(1-alpha, nu)
	lo, hi := 0.0, 4*t+10
	for range 200 {
		mid := (lo + hi) / 2
		if NoncentralT(t, nu, mid) > beta {
			lo = mid
		} else {
			hi = mid
		}
		if hi-lo <= 1e-12*hi {
			break
		}
	}
	return (lo + hi) / 2
}

// NoncentralT returns P(T ≤ t) of the non-central t with nu degrees of freedom and
// non-centrality delta: the mean of Φ(t·s − δ) over s = √(χ²/ν), by Gauss–Legendre
// over the stretch that holds all but 1e-13 of s.
func NoncentralT(t, nu, delta float64) float64 {
	chi := distuv.ChiSquared{K: nu}
	a, b := math.Sqrt(chi.Quantile(1e-14)/nu), math.Sqrt(chi.Quantile(1-1e-14)/nu)
	lg, _ := math.Lgamma(nu / 2)
	density := func(s float64) float64 { // of s
		return math.Exp(math.Ln2 + nu/2*math.Log(nu/2) - lg + (nu-1)*math.Log(s) - nu*s*s/2)
	}
	f := func(s float64) float64 { return distuv.UnitNormal.CDF(t*s-delta) * density(s) }
	sum := 0.0
	const pieces = 8
	for p := range pieces {
		lo, hi := a+(b-a)*float64(p)/pieces, a+(b-a)*float64(p+1)/pieces
		sum += quad.Fixed(f, lo, hi, 40, quad.Legendre{}, 0)
	}
	return sum
}

// ISO holds the capability of detection of a straight line in the unit of the
// amounts (ISO 11843-2; formulas from memory).
type ISO struct {
	Critical, Detectable float64 // net amounts x_c and x_d
	Response             float64 // y_c, critical value of the signal
	SD                   float64 // of the residuals, in the unit of the signal
	DF                   float64
}

// ISO11843 fits signal y against amount x by a straight line and returns the
// critical and the minimum detectable amount for a sample measured k times. It
// gives NaN for fewer than three points or a slope that is not positive.
func ISO11843(x, y []float64, k int) ISO {
	n := float64(len(x))
	nan := math.NaN()
	out := ISO{nan, nan, nan, nan, n - 2}
	if len(x) < 3 {
		return out
	}
	var mx, my, sxx, sxy, rss float64
	for i := range x {
		mx, my = mx+x[i]/n, my+y[i]/n
	}
	for i := range x {
		sxx += (x[i] - mx) * (x[i] - mx)
		sxy += (x[i] - mx) * (y[i] - my)
	}
	slope := sxy / sxx
	for i := range x {
		d := y[i] - my - slope*(x[i]-mx)
		rss += d * d
	}
	if !(slope > 0) {
		return out
	}
	s := math.Sqrt(rss / (n - 2))
	root := math.Sqrt(1/float64(k) + 1/n + mx*mx/sxx)
	t := TQuantile(0.95, n-2)
	out.SD = s
	out.Response = my - slope*mx + t*s*root
	out.Critical = t * s / slope * root
	out.Detectable = Delta(n-2, 0.05, 0.05) * s / slope * root
	return out
}

// MDL is the method detection limit of n replicates at a low level: t(n−1, 0.99)·s
// (40 CFR 136, appendix B).
func MDL(s float64, n int) float64 { return TQuantile(0.99, float64(n-1)) * s }
