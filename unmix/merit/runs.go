package merit

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// RunCount tells whether the signs of a series change as often as chance would.
type RunCount struct {
	Positive, Negative, Runs int
	Mean, Variance, Z        float64 // Z below 0: fewer runs, neighbours alike
}

// Runs counts the runs of equal sign (Wald & Wolfowitz; formulas from memory).
// Zeros and NaN are passed over. Z is NaN where all signs are equal.
func Runs(v []float64) RunCount {
	r := RunCount{}
	last := 0
	for _, x := range v {
		var s int
		switch {
		case x > 0:
			s = 1
			r.Positive++
		case x < 0:
			s = -1
			r.Negative++
		default:
			continue
		}
		if s != last {
			r.Runs++
		}
		last = s
	}
	a, b := float64(r.Positive), float64(r.Negative)
	n := a + b
	r.Mean = 2*a*b/n + 1
	r.Variance = 2 * a * b * (2*a*b - n) / (n * n * (n - 1))
	r.Z = (float64(r.Runs) - r.Mean) / math.Sqrt(r.Variance)
	return r
}

// RunsMap counts runs along the emission of every scan of a map, J × K row-major:
// counts, means and variances of the scans add up. A missing cell ends a run.
func RunsMap(m []float64, rows, cols int) RunCount {
	var sum RunCount
	for j := range rows {
		for from := 0; from < cols; {
			to := from
			for to < cols && m[j*cols+to] == m[j*cols+to] {
				to++
			}
			if r := Runs(m[j*cols+from : j*cols+to]); r.Positive > 0 && r.Negative > 0 && r.Positive+r.Negative > 2 {
				sum.Positive, sum.Negative, sum.Runs = sum.Positive+r.Positive, sum.Negative+r.Negative, sum.Runs+r.Runs
				sum.Mean, sum.Variance = sum.Mean+r.Mean, sum.Variance+r.Variance
			}
			from = to + 1
		}
	}
	sum.Z = (float64(sum.Runs) - sum.Mean) / math.Sqrt(sum.Variance)
	return sum
}

// DurbinWatson returns d = Σ(e_t − e_{t−1})²/Σe_t²: 2 where neighbours have nothing
// to do with each other, towards 0 where they are alike.
func DurbinWatson(e []float64) float64 {
	var num, den float64
	for i, v := range e {
		if i > 0 {
			num += (v - e[i-1]) * (v - e[i-1])
		}
		den += v * v
	}
	return num / den
}

// DurbinWatsonBounds returns the bounds dL and dU of the alpha point of d for n
// residuals of a regression with an intercept and k regressors beside it: the
// quantiles of Σλz²/Σz² with the n−k−1 smallest and largest of λ_j = 2(1 − cos(πj/n)).
func DurbinWatsonBounds(n, k int, alpha float64) (lower, upper float64) {
	lam := make([]float64, n-1)
	for j := range lam {
		lam[j] = 2 * (1 - math.Cos(math.Pi*float64(j+1)/float64(n)))
	}
	m := n - k - 1
	quantile := func(lam []float64) float64 {
		lo, hi := 0.0, 4.0
		shifted := make([]float64, len(lam))
		for hi-lo > 1e-10 {
			d := (lo + hi) / 2
			for i, l := range lam {
				shifted[i] = l - d
			}
			if 1-imhof(shifted, 0) < alpha {
				lo = d
			} else {
				hi = d
			}
		}
		return (lo + hi) / 2
	}
	return quantile(lam[:m]), quantile(lam[len(lam)-m:])
}

// imhof returns P(Σλz² > x) for standard normal z and many λ of either sign (Imhof
// 1961, Biometrika 48, 419): ½ + 1/π ∫ sin θ(u)/(u ρ(u)) du. It needs some ten
// terms, so that the integrand falls fast.
func imhof(lam []float64, x float64) float64 {
	f := func(u float64) float64 {
		theta, logRho := -x*u/2, 0.0
		for _, l := range lam {
			theta += math.Atan(l*u) / 2
			logRho += math.Log1p(l*l*u*u) / 4
		}
		return math.Sin(theta) / u * math.Exp(-logRho)
	}
	top := 0.0
	for _, l := range lam {
		top = math.Max(top, math.Abs(l))
	}
	const piece = 0.25
	sum, step := 0.0, piece/top
	for a := 0.0; ; a += step {
		s := gauss(f, a, a+step)
		sum += s
		logRho := 0.0
		for _, l := range lam {
			logRho += math.Log1p(l*l*a*a) / 4
		}
		if a > 0 && logRho > 32 { // integrand below 1e-14
			break
		}
		if a > 50/top {
			step = piece / top * a * top / 50 // smooth far out: ever longer pieces
		}
	}
	return 0.5 + sum/math.Pi
}

// gauss is the five-point Gauss–Legendre rule.
func gauss(f func(float64) float64, a, b float64) float64 {
	c, h := (a+b)/2, (b-a)/2
	const x1, x2 = 0.5384693101056831, 0.9061798459386640
	const w0, w1, w2 = 0.5688888888888889, 0.4786286704993665, 0.2369268850561891
	return h * (w0*f(c) + w1*(f(c-h*x1)+f(c+h*x1)) + w2*(f(c-h*x2)+f(c+h*x2)))
}

// QLimits are limits of the sum of squared residuals Q from the eigenvalues of the
// residuals' covariance, by three methods; print the method with the limit.
type QLimits struct {
	JacksonMudholkar float64 // Jackson & Mudholkar 1979; 4 % high at 99 % in a worked case
	Box              float64 // g·χ²(h), g = θ2/θ1, h = θ1²/θ2
	Exact            float64 // of Σλz², by Ruben's series
}

// QLimit returns the limits that Q exceeds with probability 1 − p.
func QLimit(eigenvalues []float64, p float64) QLimits {
	var t1, t2, t3 float64
	for _, l := range eigenvalues {
		t1, t2, t3 = t1+l, t2+l*l, t3+l*l*l
	}
	h0 := 1 - 2*t1*t3/(3*t2*t2)
	z := distuv.UnitNormal.Quantile(p)
	jm := t1 * math.Pow(1+z*h0*math.Sqrt(2*t2)/t1+t2*h0*(h0-1)/(t1*t1), 1/h0)
	box := t2 / t1 * distuv.ChiSquared{K: t1 * t1 / t2}.Quantile(p)
	lo, hi := 0.0, 10*box
	for hi-lo > 1e-11*hi {
		if mid := (lo + hi) / 2; chiMixture(eigenvalues, mid) < p {
			lo = mid
		} else {
			hi = mid
		}
	}
	return QLimits{jm, box, (lo + hi) / 2}
}

// chiMixture returns P(Σλz² ≤ x) for positive λ: Ruben's series Σ a_k F(n+2k, x/β)
// (Ruben 1962, Ann. Math. Statist. 33, 542; from memory) with β the smallest λ.
func chiMixture(lam []float64, x float64) float64 {
	beta := math.Inf(1)
	for _, l := range lam {
		beta = math.Min(beta, l)
	}
	a0 := 1.0
	for _, l := range lam {
		a0 *= math.Sqrt(beta / l)
	}
	a, g := []float64{a0}, []float64{0}
	sum, weight := 0.0, 0.0
	for k := 0; k < 2000; k++ {
		if k > 0 {
			gk := 0.0
			for _, l := range lam {
				gk += math.Pow(1-beta/l, float64(k))
			}
			g = append(g, gk)
			ak := 0.0
			for r := range k {
				ak += g[k-r] * a[r]
			}
			a = append(a, ak/float64(2*k))
		}
		sum += a[k] * distuv.ChiSquared{K: float64(len(lam) + 2*k)}.CDF(x/beta)
		if weight += a[k]; weight > 1-1e-13 {
			break
		}
	}
	return sum
}

// T2Limits returns the limits of Hotelling's T² of a components and n training
// samples, for a new sample and for one of the training set (Tracy, Young & Mason
// 1992).
func T2Limits(a, n int, p float64) (fresh, training float64) {
	x, m := float64(a), float64(n)
	f := distuv.F{D1: x, D2: m - x}.Quantile(p)
	b := distuv.Beta{Alpha: x / 2, Beta: (m - x - 1) / 2}.Quantile(p)
	return x * (m*m - 1) / (m * (m - x)) * f, (m - 1) * (m - 1) / m * b
}
