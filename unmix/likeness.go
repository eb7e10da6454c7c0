package unmix

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// Likeness says what the bottles of a model look like, so that a new bottle can
// be held against them: the distribution of the logarithms of their
// contributions (Hotelling's T²; contributions of natural water are nearer to
// log-normal than to normal) and of the share of their signal that the model
// leaves over.
type Likeness struct {
	N        int         `json:"bottles"`
	Rate     float64     `json:"rate"`    // share of like bottles that exceed a limit by chance
	Floor    []float64   `json:"floor"`   // contributions below it count as it
	Mean     []float64   `json:"mean"`    // of ln contribution
	Inverse  [][]float64 `json:"inverse"` // of their covariance
	T2       float64     `json:"t2_limit"`
	Residual float64     `json:"residual_limit"` // of SSE/SST
}

// NewLikeness describes bottles by their contributions, N × F row-major, and the
// shares of their signal that are left over. It needs F + 2 bottles and more;
// rate is the share of like bottles that may exceed each limit, such as 0.01.
func NewLikeness(value []float64, components int, left []float64, rate float64) (*Likeness, error) {
	n := len(left)
	if n < components+2 {
		return nil, errors.New("too few bottles to say what is like them")
	}
	l := &Likeness{N: n, Rate: rate, Floor: make([]float64, components), Mean: make([]float64, components)}
	for i, v := range value {
		l.Floor[i%components] += 1e-3 * v / float64(n)
	}
	logs := mat.NewDense(n, components, nil)
	for i := range n {
		for f := range components {
			if l.Floor[f] == 0 {
				return nil, errors.New("a component that no bottle holds cannot be judged")
			}
			x := math.Log(max(value[i*components+f], l.Floor[f]))
			logs.Set(i, f, x)
			l.Mean[f] += x / float64(n)
		}
	}
	cov := mat.NewSymDense(components, nil)
	stat.CovarianceMatrix(cov, logs, nil)
	var chol mat.Cholesky
	if !chol.Factorize(cov) || chol.Cond() > 1e12 {
		return nil, errors.New("the components of these bottles vary together, so that likeness cannot be judged")
	}
	inv := mat.NewSymDense(components, nil)
	if err := chol.InverseTo(inv); err != nil {
		return nil, err
	}
	for f := range components {
		l.Inverse = append(l.Inverse, mat.Row(nil, f, inv))
	}
	l.T2 = T2Limit(n, components, rate)
	m, v := stat.MeanVariance(left, nil)
	l.Residual = boxLimit(m, v, rate)
	return l, nil
}

// T2Limit is the limit that a new bottle's T² exceeds with probability rate, for
// n bottles and a components: a(n²−1)/(n(n−a))·F(a, n−a) (Tracy, Young & Mason
// 1992, J. Qual. Technol. 24, 88; from memory).
func T2Limit(n, a int, rate float64) float64 {
	nf, af := float64(n), float64(a)
	return af * (nf*nf - 1) / (nf * (nf - af)) * distuv.F{D1: af, D2: nf - af}.Quantile(1-rate)
}

// boxLimit is the limit of a sum of squares with mean m and variance v by a scaled
// chi-square with the same moments, g = v/2m, h = 2m²/v (Box 1954; from memory).
func boxLimit(m, v, rate float64) float64 {
	if m <= 0 || v <= 0 {
		return m
	}
	g, h := v/(2*m), 2*m*m/v
	return g * distuv.ChiSquared{K: h}.Quantile(1-rate)
}

// Distance returns T² of a bottle's contributions.
func (l *Likeness) Distance(value []float64) float64 {
	d := make([]float64, len(value))
	for f, v := range value {
		d[f] = math.Log(max(v, l.Floor[f])) - l.Mean[f]
	}
	t := 0.0
	for f := range d {
		for h := range d {
			t += d[f] * l.Inverse[f][h] * d[h]
		}
	}
	return t
}
