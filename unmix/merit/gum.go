package merit

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"
)

// Satterthwaite returns the degrees of freedom of a variance that is the sum of
// v[i], each on df[i] degrees of freedom (0 or +Inf: known): (Σv)²/Σ(v²/df), +Inf
// where all are known (Welch–Satterthwaite, JCGM 100:2008, G.4.1).
func Satterthwaite(v, df []float64) float64 {
	sum, den := 0.0, 0.0
	for i, x := range v {
		sum += x
		if df[i] > 0 && !math.IsInf(df[i], 1) {
			den += x * x / df[i]
		}
	}
	if den == 0 {
		return math.Inf(1)
	}
	return sum * sum / den
}

// TQuantile returns the p quantile of Student's t with nu degrees of freedom, the
// normal one for +Inf or 0.
func TQuantile(p, nu float64) float64 {
	if math.IsInf(nu, 1) || !(nu > 0) || nu > 1e6 {
		return distuv.UnitNormal.Quantile(p)
	}
	return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}.Quantile(p)
}

// ShortestInterval returns the shortest interval that holds the share p of the
// draws, whose order it changes (JCGM 101:2008, 5.3.4 and 7.7). It panics on no
// draws.
func ShortestInterval(draws []float64, p float64) (lo, hi float64) {
	m := len(draws)
	q := min(m-1, int(math.Round(p*float64(m))))
	// Only the m−q lowest and the m−q highest draws can be its ends.
	if tail := m - q; 2*tail < m {
		partition(draws, tail)
		partition(draws[tail:], m-2*tail)
		slices.Sort(draws[:tail])
		slices.Sort(draws[m-tail:])
	} else {
		slices.Sort(draws)
	}
	lo, hi = draws[0], draws[q]
	for r := 1; r+q < m; r++ {
		if draws[r+q]-draws[r] < hi-lo {
			lo, hi = draws[r], draws[r+q]
		}
	}
	return lo, hi
}

// partition brings the k smallest values to the front (Hoare 1961, Commun. ACM 4,
// 321).
func partition(v []float64, k int) {
	for lo, hi := 0, len(v)-1; lo < hi; {
		pivot, i, j := v[(lo+hi)/2], lo, hi
		for i <= j {
			for v[i] < pivot {
				i++
			}
			for pivot < v[j] {
				j--
			}
			if i <= j {
				v[i], v[j] = v[j], v[i]
				i, j = i+1, j-1
			}
		}
		switch {
		case k-1 <= j:
			hi = j
		case k-1 >= i:
			lo = i
		default:
			return
		}
	}
}

// FromPairs returns the standard deviation of one measurement from the differences
// of m duplicates: √(Σd²/2m).
func FromPairs(d []float64) float64 {
	ss := 0.0
	for _, v := range d {
		ss += v * v
	}
	return math.Sqrt(ss / float64(2*len(d)))
}

// Rectangular is the standard uncertainty of anything within ± a, all values alike
// (JCGM 100:2008, 4.3).
func Rectangular(a float64) float64 { return a / math.Sqrt(3) }

// Triangular is the standard uncertainty of a symmetric triangle of half-width a.
func Triangular(a float64) float64 { return a / math.Sqrt(6) }
