package main

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/report"
)

// given is a known amount in a bottle and what was found of it.
type given struct {
	bottle    *prepare.Bottle
	component string
	f, row    int     // of the resolution
	given     float64 // amount in the bottle
	found     float64 // less what it held before a spike
	test      string  // the test of its recovery
	limit     float64 // %, of the test
}

// recovery is what was found of what was given, %; NaN where nothing was given.
func (g given) recovery() float64 {
	if g.given > 0 {
		return 100 * g.found / g.given
	}
	return nan
}

// off says whether the recovery is beyond its limit.
func (g given) off() bool { return math.Abs(g.recovery()-100) > g.limit }

// verdict judges the recovery. The only standard of its component is its own
// measure and finds itself whatever it holds: it is not judged.
func (g given) verdict(only bool) (verdict, reason string) {
	switch {
	case only:
		return "", "not judged: the only standard of " + g.component + " finds itself; bring a second level or a control"
	case g.off():
		return "doubt", g.accepted()
	}
	return "pass", ""
}

func (g given) accepted() string {
	return fmt.Sprintf("recovery %.1f %%, accepted %g–%g %%", g.recovery(), 100-g.limit, 100+g.limit)
}

// givens lists the known amounts of standards, controls and spikes that the
// references are held against.
func (j *job) givens() []given {
	r := j.references0()
	if r == nil {
		return nil
	}
	lowest := j.lowestLevels()
	var out []given
	for _, b := range j.sv.Bottles {
		i, ok := j.row[b]
		test := map[survey.Kind]string{survey.Standard: "standard-recovery", survey.Control: "control-recovery", survey.Spike: "spike-recovery"}[b.Row.Kind]
		if !ok || test == "" {
			continue
		}
		for _, c := range b.Row.Conc {
			f := slices.Index(r.Set.Names(), c.Name)
			if f < 0 {
				continue
			}
			g := given{bottle: b, component: c.Name, f: f, row: i, given: c.Value * b.Undiluted(), found: r.Value[i*r.Set.Len()+f],
				test: test, limit: j.sv.Limit(test)}
			if b.Row.Kind == survey.Spike {
				l, ok := j.row[j.bottle(b.Row.SpikeOf)]
				if !ok {
					continue
				}
				g.found -= r.Value[l*r.Set.Len()+f]
			}
			if b.Row.Kind == survey.Standard && g.given <= lowest[c.Name] {
				g.limit *= 2
			}
			out = append(out, g)
		}
	}
	return out
}

// lowestLevels is the lowest amount above zero of each component's standards.
func (j *job) lowestLevels() map[string]float64 {
	out := map[string]float64{}
	for _, b := range j.sv.Bottles {
		if !j.calibrates(b) {
			continue
		}
		for _, c := range b.Row.Conc {
			if v := c.Value * b.Undiluted(); v > 0 && (out[c.Name] == 0 || v < out[c.Name]) {
				out[c.Name] = v
			}
		}
	}
	return out
}

// calibrating counts the standards that each component's reference was made of.
func (j *job) calibrating() map[string]int {
	out := map[string]int{}
	for _, b := range j.sv.Bottles {
		for _, c := range b.Row.Conc {
			if j.calibrates(b) && b.Usable() && c.Value > 0 {
				out[c.Name]++
			}
		}
	}
	return out
}

// calibrationTable makes calibration.csv: every standard, control and spike,
// against what the references find.
func (j *job) calibrationTable() *report.Table {
	t := report.New("calibration.csv")
	lines := map[string]unmix.Line{}
	for _, l := range j.lines {
		lines[l.Component] = l
	}
	k := slices.IndexFunc(j.res, func(r *unmix.Resolution) bool { return r.Set.Method == "references" })
	only := j.calibrating()
	for _, g := range j.givens() {
		b := g.bottle
		l, has := lines[g.component]
		if !has {
			l = unmix.Line{Slope: nan, Intercept: nan, InterceptSE: nan}
		}
		low, high, verdict, reason := nan, nan, "", ""
		if g.given > 0 {
			low, high = 100-g.limit, 100+g.limit
			verdict, reason = g.verdict(j.calibrates(b) && only[g.component] == 1)
		}
		t.Append(b.Row.ID, b.Batch, string(b.Row.Kind), g.component, g.given, g.found, j.res[k].Set.Components[g.f].AmountUnit,
			j.judge[k].Spreads[g.row].U[g.f], g.recovery(), low, high, j.calibrates(b), verdict, reason, l.Slope, l.Intercept, l.InterceptSE)
	}
	return t
}

// recoveryFlags tells which standards, controls and spikes were not found again.
func (j *job) recoveryFlags() []eem.Flag {
	var out []eem.Flag
	for _, g := range j.givens() {
		if !(g.given > 0) || !g.off() {
			continue
		}
		msg := fmt.Sprintf("%.1f %% of the %s given was found; accepted are %g–%g %%", g.recovery(), g.component, 100-g.limit, 100+g.limit)
		if g.test == "standard-recovery" {
			msg = fmt.Sprintf("calculated back, this standard of %s holds %.1f %% of its amount; accepted are %g–%g %%: look at its dilution, or keep it out with exclude_from_fit", g.component, g.recovery(), 100-g.limit, 100+g.limit)
		}
		out = append(out, j.sv.Accept(eem.Flag{ID: g.bottle.Row.ID, Batch: g.bottle.Batch, Component: g.component, Method: "references", Test: g.test,
			Severity: eem.Doubt, Value: g.recovery(), Limit: g.limit, Msg: msg}))
		if act := j.sv.Limit("control-action"); g.test == "control-recovery" && math.Abs(g.recovery()-100) > act {
			out = append(out, j.sv.Accept(eem.Flag{Batch: g.bottle.Batch, Component: g.component, Method: "references", Test: "control-action",
				Severity: eem.Reject, Value: g.recovery(), Limit: act,
				Msg: fmt.Sprintf("%.1f %% of the %s given was found in control %s, beyond the action limits of %g–%g %%; look for the cause and measure the batch again", g.recovery(), g.component, g.bottle.Row.ID, 100-act, 100+act)}))
		}
	}
	return out
}

// lineFlags tells where the standards' own line does not pass through zero or is
// left.
func (j *job) lineFlags() []eem.Flag {
	var out []eem.Flag
	add := func(component, test string, sev eem.Severity, v, limit float64, msg string) {
		out = append(out, j.sv.Accept(eem.Flag{Component: component, Method: "references", Test: test, Severity: sev, Value: v, Limit: limit, Msg: msg}))
	}
	for _, l := range j.lines {
		if t, limit, doubtful := l.Doubtful(j.sv.Limit("reference-intercept")); doubtful {
			add(l.Component, "reference-intercept", eem.Doubt, t, limit,
				fmt.Sprintf("the standards of %s do not lie on a line through zero: %s; look for a blank that was not subtracted, or contaminated levels", l.Component, l))
		}
		limit := j.sv.Limit("linearity")
		if at, d, left := leavesLine(l.Points, limit); left {
			add(l.Component, "linearity", eem.Doubt, d, limit,
				fmt.Sprintf("from %.4g on the standards of %s leave the line of the lower levels, by %+.0f %% at the highest; use lower standards, and dilute bottles above that", at, l.Component, d))
		}
	}
	return out
}

// levelFlags tells which references rest on few levels.
func (j *job) levelFlags(set *unmix.Set) []eem.Flag {
	var out []eem.Flag
	for _, c := range set.Components {
		if limit := j.sv.Limit("reference-levels"); c.Levels > 0 && float64(c.Levels) < limit {
			out = append(out, j.sv.Accept(eem.NewFlag(eem.Flag{Component: c.Name, Method: "references", Test: "reference-levels", Severity: eem.Remark,
				Value: float64(c.Levels), Limit: limit, Msg: fmt.Sprintf("the reference of %s rests on %s; whether the response is a line cannot be told", c.Name, eem.Count(c.Levels, "level"))})))
		}
	}
	return out
}

// leavesLine looks for the amount from which on standards leave the line through
// zero of the levels below by more than limit percent, all to one side (the idea of
// ASTM E578: where does the response leave the line). The lowest two levels make
// the line; one above that is off alone takes no part in it. d is the departure of
// the highest level, %.
func leavesLine(points []unmix.Point, limit float64) (at, d float64, left bool) {
	ps := slices.DeleteFunc(slices.Clone(points), func(p unmix.Point) bool { return !(p.Given > 0) || math.IsNaN(p.Found) })
	slices.SortStableFunc(ps, func(a, b unmix.Point) int { return cmp.Compare(a.Given, b.Given) })
	var xy, xx float64
	levels := 0
	for i, p := range ps {
		if i == 0 || p.Given > ps[i-1].Given {
			levels++
		}
		off := func(q unmix.Point) float64 { return 100 * (q.Found/q.Given*xx/xy - 1) }
		if levels > 2 && math.Abs(off(p)) > limit {
			side := math.Copysign(1, off(p))
			all := true
			for _, q := range ps[i:] {
				d = off(q)
				all = all && d*side > limit
			}
			if all {
				return p.Given, d, true
			}
			continue
		}
		xy, xx = xy+p.Given*p.Found, xx+p.Given*p.Given
	}
	return nan, nan, false
}
