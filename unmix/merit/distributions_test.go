package merit_test

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/unmix/merit"
)

// Limits and intervals rest on these distributions: SciPy's answers, as
// testdata/merit/distributions.py writes them. gonum finds the quantiles of F, t and
// beta from one incomplete beta integral, good to some 1e-8.
func TestDistributions(t *testing.T) {
	f, err := os.Open("../../testdata/merit/distributions.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range rows[1:] {
		var v [4]float64 // first, second, p, quantile
		for i, s := range r[1:] {
			if s == "" {
				continue
			}
			if v[i], err = strconv.ParseFloat(s, 64); err != nil {
				t.Fatal(err)
			}
		}
		var got float64
		want := v[3]
		switch r[0] {
		case "normal":
			got = merit.TQuantile(v[2], math.Inf(1))
		case "t":
			got = merit.TQuantile(v[2], v[0])
		case "chi2":
			got = distuv.ChiSquared{K: v[0]}.Quantile(v[2])
		case "F":
			got = distuv.F{D1: v[0], D2: v[1]}.Quantile(v[2])
		case "beta":
			got = distuv.Beta{Alpha: v[0], Beta: v[1]}.Quantile(v[2])
		case "nct":
			got, want = merit.NoncentralT(v[3], v[0], v[1]), v[2]
		default:
			t.Fatalf("distribution %q", r[0])
		}
		if !(math.Abs(got-want) <= 1e-7*math.Abs(want)+1e-10) {
			t.Errorf("%v: %.12g, want %.12g", r, got, want)
		}
	}
}

// Shortest intervals with a known answer: of the exponential distribution 0 to ln 20,
// of the normal one ± 1.96; and the calibration of a mass of JCGM 101:2008, 9.3
// (table 6, from memory), whose output is skew in no way but wider than the law of
// propagation says: 1.2340 ± 0.0754 mg, shortest 95 % interval 1.0834 to 1.3825 mg.
func TestShortestInterval(t *testing.T) {
	const n = 400_000
	rnd := rand.New(rand.NewPCG(3, 101))
	draw := func(one func() float64) []float64 {
		v := make([]float64, n)
		for i := range v {
			v[i] = one()
		}
		return v
	}
	within := func(lo, hi float64) float64 { return lo + (hi-lo)*rnd.Float64() }
	for _, c := range []struct {
		name        string
		one         func() float64
		lo, hi, tol float64
	}{
		{"exponential", rnd.ExpFloat64, 0, math.Log(20), 0.02},
		{"normal", rnd.NormFloat64, -1.96, 1.96, 0.05}, // the ends of the shortest are flat, their distance is not
		{"mass", func() float64 {
			m := 100_000 + 0.05*rnd.NormFloat64() + 1.234 + 0.02*rnd.NormFloat64()
			air, water, ref := within(1.1, 1.3), within(7000, 9000), within(7950, 8050)
			return m*(1+(air-1.2)*(1/water-1/ref)) - 100_000
		}, 1.0834, 1.3825, 0.006},
	} {
		lo, hi := merit.ShortestInterval(draw(c.one), 0.95)
		if math.Abs(lo-c.lo) > c.tol || math.Abs(hi-c.hi) > c.tol || math.Abs((hi-lo)/(c.hi-c.lo)-1) > 0.01 {
			t.Errorf("%s: %.4f to %.4f, want %.4f to %.4f", c.name, lo, hi, c.lo, c.hi)
		}
	}
}
