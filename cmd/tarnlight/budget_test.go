package main

import (
	"math"
	"testing"

	"tarnlight/unmix/report"
)

// budgetAddsUp fails unless the squares of a value's budget add up to that of its
// standard uncertainty, shares to 100 %, largest first.
func budgetAddsUp(t *testing.T, budget, contributions *report.Table) {
	t.Helper()
	type key struct{ id, component, method string }
	sum, share, last := map[key]float64{}, map[key]float64{}, map[key]float64{}
	col := func(r []string, name string) string { return r[budget.Col(name)] }
	for _, r := range budget.Rows {
		if col(r, "standard_uncertainty") == "" {
			continue
		}
		k := key{col(r, "id"), col(r, "component"), col(r, "method")}
		u := number(t, col(r, "standard_uncertainty"))
		if before, ok := last[k]; ok && u > before {
			t.Errorf("%v: %s is larger than the cause before", k, col(r, "cause"))
		}
		last[k] = u
		sum[k] += u * u
		share[k] += number(t, col(r, "share_percent"))
	}
	n := 0
	for _, r := range contributions.Rows {
		c := contributions
		k := key{r[c.Col("id")], r[c.Col("component")], r[c.Col("method")]}
		if k.method == "unexplained" || r[c.Col("standard_uncertainty")] == "" {
			continue
		}
		n++
		if u := number(t, r[c.Col("standard_uncertainty")]); math.Abs(math.Sqrt(sum[k])/u-1) > 1e-9 || math.Abs(share[k]-100) > 1e-6 {
			t.Errorf("%v: the budget gives %.9g (%.6f %%), the contribution %.9g", k, math.Sqrt(sum[k]), share[k], u)
		}
		if lo, hi, v := number(t, r[c.Col("lower95")]), number(t, r[c.Col("upper95")]), number(t, r[c.Col("value")]); lo < 0 || lo > v || hi < v {
			t.Errorf("%v: %g not in %g – %g", k, v, lo, hi)
		}
	}
	if n == 0 {
		t.Error("no contribution has an uncertainty")
	}
}
