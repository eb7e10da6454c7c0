package main

import (
	"bytes"
	"math"
	"strings"
	"testing"
)

// Tests over many bottles state their rate, how many findings chance alone would
// give and how many there are: in tests.csv, at the end of a run, and, by bottle, in
// the flag itself.
func TestChances(t *testing.T) {
	d := erring(3, false)
	d.Samples, d.Unknown = 12, 2
	s := d.Survey()
	s.Settings = erringSettings
	j := simulated(t, s, false)
	j.collectFlags()
	tab := j.testTable()
	count := map[string]int{}
	for _, f := range j.flags {
		count[f.Test]++
	}
	// Survival function of the standard normal distribution at 4, SciPy 1.11:
	// norm.sf(4) = 3.16712418e-05.
	for test, rate := range map[string]float64{"structure": 3.16712418e-05, "unexplained": 3.16712418e-05, "unknown": 0.01, "reference-intercept": 0.05} {
		n := number(t, cell(t, tab, "n", "test", test))
		if r := number(t, cell(t, tab, "rate", "test", test)); math.Abs(r/rate-1) > 1e-8 {
			t.Errorf("%s: rate %g, want %g", test, r, rate)
		}
		if e := number(t, cell(t, tab, "expected_by_chance", "test", test)); math.Abs(e-n*rate) > 1e-8*e {
			t.Errorf("%s: %g expected of %g", test, e, n)
		}
		if found := number(t, cell(t, tab, "found", "test", test)); int(found) != count[test] {
			t.Errorf("%s: %g found, %d flags", test, found, count[test])
		}
	}
	if n := cell(t, tab, "n", "test", "detected", "component", "pyrene"); n != "12" {
		t.Errorf("%s decisions on pyrene in 12 samples", n)
	}
	if count["unknown"] != 2 {
		t.Errorf("%d bottles show the unknown, 2 hold it", count["unknown"])
	}
	var out bytes.Buffer
	j.tellChances(&out)
	for _, want := range []string{"unknown (references): 2 found; by chance 0.01 in 1 survey\n", "residuals (references) were held against the noise model"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("no %q in\n%s", want, out.String())
		}
	}
	for _, f := range j.flags {
		if (f.Test == "structure" || f.Test == "unknown") && !strings.Contains(f.Msg, "by chance one") && !strings.Contains(f.Msg, "by chance in one of 100 surveys") {
			t.Errorf("%s does not say how often it comes by chance: %s", f.Test, f.Msg)
		}
	}
}

// The only standard of a component finds itself, which proves nothing.
func TestOnlyStandardIsNotJudged(t *testing.T) {
	g := given{component: "a", given: 2, found: 2, limit: 15}
	if v, why := g.verdict(true); v != "" || !strings.Contains(why, "only standard of a") {
		t.Errorf("verdict %q, %q", v, why)
	}
	if v, _ := g.verdict(false); v != "pass" {
		t.Errorf("verdict %q of two levels", v)
	}
	g.found = 3
	if v, _ := g.verdict(false); v != "doubt" {
		t.Errorf("verdict %q of 150 %%", v)
	}
}
