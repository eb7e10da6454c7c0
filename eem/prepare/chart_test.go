package prepare_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/eem/prepare"
)

// of makes a chart of values with mean 0 and standard deviation 1: a long run in
// control, to which the values are appended.
func of(values ...float64) prepare.Chart {
	var c prepare.Chart
	for i := range 2000 { // ±1 in turn: no rule is broken
		c.Points = append(c.Points, prepare.ChartPoint{Batch: "before", Value: float64(1 - 2*(i%2))})
	}
	for _, v := range values {
		c.Points = append(c.Points, prepare.ChartPoint{Batch: "last", Value: v})
	}
	return c
}

// Each rule on the pattern that its definition names, and on the pattern that just
// misses it (METHODS 9.2; Westgard et al. 1981).
func TestWestgardRules(t *testing.T) {
	for _, c := range []struct {
		values []float64
		want   []string
		broken bool
	}{
		{[]float64{1.5}, nil, false},
		{[]float64{2.5}, []string{prepare.Rule12s}, false},
		{[]float64{3.5}, []string{prepare.Rule12s, prepare.Rule13s}, true},
		{[]float64{2.5, 2.5}, []string{prepare.Rule12s, prepare.Rule22s}, true},
		{[]float64{-2.5, 2.5}, []string{prepare.Rule12s, prepare.RuleR4s}, true},
		{[]float64{-1.8, 2.5}, []string{prepare.Rule12s}, false},
		{[]float64{1.5, 1.2, 1.5, 1.2}, []string{prepare.Rule41s}, true},
		{[]float64{1.5, 1.2, 0.5, 1.2}, nil, false},
		{slices.Repeat([]float64{-0.3}, 10), []string{prepare.Rule10x}, true},
	} {
		rows := of(c.values...).Judge(20)
		last := rows[len(rows)-1]
		if !slices.Equal(last.Rules, c.want) || last.Broken != c.broken {
			t.Errorf("%v: %v, broken %v; want %v, %v", c.values, last.Rules, last.Broken, c.want, c.broken)
		}
	}
}

// On normal values in control the rules raise the false alarms computed from the
// normal distribution: 1_2s 4.55 %, 1_3s 0.27 %, 4_1s 0.127 %, 10_x 0.195 %
// (METHODS 9.2, computed).
func TestFalseAlarms(t *testing.T) {
	rnd := rand.New(rand.NewPCG(5, 9))
	const n = 400_000
	var c prepare.Chart
	for range n {
		c.Points = append(c.Points, prepare.ChartPoint{Value: rnd.NormFloat64(), Batch: "one"})
	}
	for i := range c.Points {
		c.Points[i].Batch = string(rune('a' + i%7)) // no two neighbours in one batch
	}
	count := map[string]float64{}
	for _, r := range c.Judge(20) {
		for _, rule := range r.Rules {
			count[rule]++
		}
	}
	for rule, want := range map[string]float64{prepare.Rule12s: 0.0455, prepare.Rule13s: 0.0027, prepare.Rule22s: 0.00104, prepare.Rule41s: 0.00127, prepare.Rule10x: 0.00195} {
		// Runs overlap, so that counts scatter more than Poisson's: five of its
		// standard deviations, doubled.
		if got := count[rule] / n; math.Abs(got-want) > 10*math.Sqrt(want/n) {
			t.Errorf("%s: %.4f %% false alarms, want %.4f %%", rule, 100*got, 100*want)
		}
	}
	if count[prepare.RuleR4s] != 0 {
		t.Errorf("R_4s across batches: %g", count[prepare.RuleR4s])
	}
}

// R_4s within a batch, one beyond +2 s and the other beyond −2 s: 0.1035 % of pairs
// (SEC-9.2-westgard, computed).
func TestFalseAlarmsWithinBatch(t *testing.T) {
	rnd := rand.New(rand.NewPCG(6, 9))
	const pairs = 400_000
	var c prepare.Chart
	for i := range 2 * pairs {
		c.Points = append(c.Points, prepare.ChartPoint{Value: rnd.NormFloat64(), Batch: string(rune('a' + i/2%7))})
	}
	n := 0.0
	for _, r := range c.Judge(20) {
		if slices.Contains(r.Rules, prepare.RuleR4s) {
			n++
		}
	}
	const want = 0.0010351370073191273
	if got := n / pairs; math.Abs(got-want) > 5*math.Sqrt(want/pairs) {
		t.Errorf("%.4f %% false alarms, want %.4f %%", 100*got, 100*want)
	}
}

// With few points the plain limits hold.
func TestPlainLimits(t *testing.T) {
	c := prepare.Chart{Points: []prepare.ChartPoint{{Value: 104, Centre: 100, Low: 90, High: 110}, {Value: 111, Centre: 100, Low: 90, High: 110},
		{Value: 5, Centre: math.NaN(), Low: math.NaN(), High: math.NaN()}}}
	rows := c.Judge(20)
	if rows[0].Broken || !rows[1].Broken || rows[2].Broken || !math.IsNaN(rows[0].WarnLow) {
		t.Errorf("%+v", rows)
	}
}
