package correct

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// QuinineLine is how intensity grows with quinine sulfate: k = F per µg/L of the
// dihydrate, through the origin because the blank is subtracted.
type QuinineLine struct {
	Slope float64 // intensity per µg/L
	U     float64 // its standard uncertainty from the points' scatter; NaN for one point
	N     int     // points

	// Intercept ± InterceptU, intensity, of the points' own straight line: it
	// should be zero within its uncertainty. NaN for fewer than three points.
	Intercept, InterceptU float64
	ExNM, EmNM            float64 // nm, where F is read
}

// Quinine fits the line to standards, blank subtracted, with microg µg/L of
// quinine sulfate dihydrate in the liquid scanned, read at exNM / emNM (350/450
// by custom: 1 µg/L there is 1 quinine sulfate unit; medium and source of the
// standards belong in the report). Through the origin the best slope is
// k = Σ c·F / Σ c², u(k)² = Σ(F − k·c)² / ((n−1)·Σ c²).
func Quinine(standards []*eem.EEM, microg []float64, exNM, emNM float64) (QuinineLine, error) {
	if len(standards) != len(microg) {
		panic(fmt.Sprintf("correct: %d standards with %d concentrations", len(standards), len(microg)))
	}
	q := QuinineLine{N: len(standards), ExNM: exNM, EmNM: emNM, U: math.NaN(), Intercept: math.NaN(), InterceptU: math.NaN()}
	if q.N == 0 {
		return q, errors.New("no quinine standard to take the intensity scale from")
	}
	f := make([]float64, q.N)
	var cf, cc float64
	for i, e := range standards {
		if !(microg[i] >= 0) || math.IsInf(microg[i], 0) {
			return q, fmt.Errorf("quinine standard of %g µg/L; a concentration is 0 or more", microg[i])
		}
		if f[i] = e.Interp(exNM, emNM); math.IsNaN(f[i]) {
			return q, fmt.Errorf("a quinine standard has no value at %s (it has %s, or the cell is saturated)", eem.Spot(exNM, emNM), e.Grid)
		}
		cf, cc = cf+microg[i]*f[i], cc+microg[i]*microg[i]
	}
	if q.Slope = cf / cc; !usable(q.Slope) {
		return q, fmt.Errorf("the quinine standards do not grow with concentration (slope %s at %s)", num(q.Slope), eem.Spot(exNM, emNM))
	}
	if q.N > 1 {
		ss := 0.0
		for i := range f {
			ss += math.Pow(f[i]-q.Slope*microg[i], 2)
		}
		q.U = math.Sqrt(ss / float64(q.N-1) / cc)
	}
	if q.N > 2 {
		q.Intercept, q.InterceptU = intercept(microg, f)
	}
	return q, nil
}

// intercept of the least-squares line and its standard uncertainty.
func intercept(x, y []float64) (a, u float64) {
	a, b := stat.LinearRegression(x, y, nil, false)
	n, mx := float64(len(x)), stat.Mean(x, nil)
	var ss, sxx float64
	for i := range x {
		ss += math.Pow(y[i]-a-b*x[i], 2)
		sxx += math.Pow(x[i]-mx, 2)
	}
	if sxx == 0 {
		return math.NaN(), math.NaN()
	}
	return a, math.Sqrt(ss / (n - 2) * (1/n + mx*mx/sxx))
}

// QuinineUnits divides e by the line's slope. A known uncertainty becomes the
// cause "intensity scale" of the batch.
func QuinineUnits(e *eem.EEM, q QuinineLine, batch string) *eem.EEM {
	out := Scale(e, 1/q.Slope, eem.Quinine, record(StepScale, "divided by the intensity of 1 µg/L quinine sulfate dihydrate",
		eem.Param{Name: "quinine slope", Value: num(q.Slope), Unit: "counts L/µg", Source: "quinine standards of the batch"},
		eem.Param{Name: "standards", Value: fmt.Sprint(q.N), Source: "run sheet"},
		eem.Param{Name: "read at", Value: fmt.Sprintf("%g/%g", q.ExNM, q.EmNM), Unit: "nm", Source: "settings: intensity"}))
	if q.U > 0 {
		out.Causes = append(out.Causes, eem.Cause{Name: StepScale, Scope: eem.OfBatch, Key: batch, U: q.U / q.Slope})
	}
	return out
}
