package merit_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// correlate replaces the noise of a cube by that of a scan whose neighbours along
// emission are alike, x_k = ρ x_{k−1} + √(1−ρ²) e_k, of the same size.
func correlate(c *eem.Cube, rho, sd float64, rnd *rand.Rand) {
	nk := c.Em.Len()
	for from := 0; from < len(c.X); from += nk {
		last := rnd.NormFloat64()
		for k := range nk {
			if k > 0 {
				last = rho*last + math.Sqrt(1-rho*rho)*rnd.NormFloat64()
			}
			c.X[from+k] += sd * last
		}
	}
}

// Correlated noise is no lack of fit: held against independent neighbours most
// bottles are flagged, held against the differences of replicates none is, and what
// the model does not know still stands out. White noise changes nothing.
func TestYardstick(t *testing.T) {
	const sd, pairs = 0.02, 10
	limit := func(string) float64 { return 4 }
	accept := func(f eem.Flag) eem.Flag { return f }
	for _, rho := range []float64{0, 0.7} {
		var amounts [][]float64
		for i := range 2 * pairs {
			amounts = append(amounts, []float64{1 + float64(i/2), 2})
		}
		amounts = append(amounts, []float64{3, 3})
		c, set := mixture(amounts, []float64{430, 470}, 0, 1)
		correlate(c, rho, sd, rand.New(rand.NewPCG(4, 4)))
		for i := range c.U {
			c.U[i] = sd
		}
		odd := len(amounts) - 1 // holds a third band
		for cell := range c.Cells() {
			em := c.Em.At(cell % c.Em.Len())
			c.Sample(odd)[cell] += 0.2 * math.Exp(-math.Pow((em-450)/4, 2))
		}
		r, sp := spreads(t, c, set, nil)
		var bottles []merit.Bottle
		var rows [][2]int
		for i := range amounts {
			bottles = append(bottles, merit.Bottle{ID: fmt.Sprint(i), Row: i})
			if i%2 == 1 {
				rows = append(rows, [2]int{i, i - 1})
			}
		}
		flagged := func() (n int, odds bool, words string) {
			for _, f := range merit.Judge(r, sp, bottles, c.Sample, limit, accept, "test").Flags {
				if f.Test == "structure" || f.Test == "unexplained" {
					n, words = n+1, f.Msg
					odds = odds || f.ID == fmt.Sprint(odd)
				}
			}
			return n, odds, words
		}
		before, _, words := flagged()
		if rho == 0 && before != 1 || rho > 0 && before < pairs || !strings.Contains(words, "yardstick: the noise model") {
			t.Errorf("ρ %g, noise model: %d flagged, %q", rho, before, words)
		}
		y := merit.NewYardstick(c, r, rows)
		for i := range sp {
			sp[i].Yard = y
		}
		after, odds, words := flagged()
		if after != 1 || !odds || !strings.Contains(words, "yardstick: differences of 10 pairs of replicates, their structure Z ") {
			t.Errorf("ρ %g, replicates: %d flagged, %q", rho, after, words)
		}
		if y.Pairs != pairs || math.Abs(y.Variance-1) > 0.35 {
			t.Errorf("ρ %g: %+v", rho, y)
		}
		if z := y.Structure; rho > 0 && z < 4 || rho == 0 && math.Abs(z) > 4/math.Sqrt(pairs) {
			t.Errorf("ρ %g: structure of the differences %g", rho, z)
		}
	}
	if y := (&unmix.Yardstick{}); y.Score(3) != 3 || y.String() != "noise model" {
		t.Errorf("no replicates: %v", y)
	}
	if y := (&unmix.Yardstick{Pairs: 3, Structure: -2}); y.Score(6) != 6/math.Sqrt(1+1.0/3) {
		t.Error("differences less alike than noise move the test")
	}
}
