package main

import (
	"fmt"
	"maps"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/report"
)

// checkAlerts refuses an alert for a component that no method gives: an alarm that
// can never ring is worse than none.
func (j *job) checkAlerts() error {
	var names []string
	for _, r := range j.res {
		names = append(names, r.Set.Names()...)
	}
	for _, name := range slices.Sorted(maps.Keys(j.set.Quality.Alert)) {
		if !slices.Contains(names, name) {
			return fmt.Errorf("%s: quality.alert names %q, and no component is called that; %s", j.settingsPath(), name, meant(name, names))
		}
	}
	return nil
}

// alertFlags tells which samples hold more of a component than the settings state.
func (j *job) alertFlags() (out []eem.Flag) {
	watched := map[string]*prepare.Bottle{}
	for _, b := range j.sv.Bottles {
		if b.Row.Kind == survey.Sample {
			watched[b.Row.ID] = b
		}
	}
	for _, judged := range j.judge {
		for _, c := range judged.Contributions {
			b, limit := watched[c.ID], j.set.Quality.Alert[c.Component]
			if b == nil || limit == 0 || c.Qualifier == unmix.NotUsable || !(c.Value > limit) {
				continue
			}
			out = append(out, j.sv.Accept(eem.Flag{ID: c.ID, Batch: b.Batch, Component: c.Component, Method: c.Method, Test: "alert", Severity: eem.Doubt,
				Value: c.Value, Limit: limit, Msg: fmt.Sprintf("%s is %s %s, above the alert at %s; confirm it by another method before anybody acts on it",
					c.Component, c.Reported, c.Unit, report.Number(limit))}))
		}
	}
	return out
}
