package main

import (
	"fmt"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
)

// fittedPeak is where a component peaks.
type fittedPeak struct {
	at     string  // of what can fluoresce: "ex 275 / em 340 nm"
	own    string  // of its spectra, wherever that is
	hidden bool    // that is where nothing fluoresces
	share  float64 // of its own maximum that can be seen, 1 where it is not hidden
}

func peakOf(g eem.Grid, ex, em []float64) fittedPeak {
	name := func(c [2]int) string {
		if c[0] < 0 {
			return "nowhere"
		}
		return fmt.Sprintf("ex %s / em %s nm", eem.NM(g.Ex.At(c[0])), eem.NM(g.Em.At(c[1])))
	}
	value := func(c [2]int) float64 {
		if c[0] < 0 {
			return 0
		}
		return ex[c[0]] * em[c[1]]
	}
	own, seen := unmix.Peak(g.Ex.Values(), g.Em.Values(), ex, em)
	p := fittedPeak{at: name(seen), own: name(own), share: 1}
	if p.hidden = value(seen) < value(own); p.hidden {
		p.share = value(seen) / value(own)
	}
	return p
}

// peakNotes tells of components that the data leave open at their peak, and of those
// whose spectra are greatest where nothing fluoresces.
func (j *job) peakNotes(chosen *unmix.Set, open func(c *unmix.Component) bool) {
	add := func(c *unmix.Component, code string, sev eem.Severity, v float64, msg string) {
		j.flags = append(j.flags, j.sv.Accept(eem.NewFlag(eem.Flag{Component: c.Name, Method: "parafac", Test: code, Severity: sev, Value: v, Limit: nan, Msg: msg})))
	}
	for f := range chosen.Components {
		c := &chosen.Components[f]
		p := peakOf(chosen.Grid, c.Ex, c.Em)
		if open(c) {
			where := "at its own peak (" + p.at + ")"
			if p.hidden {
				where = "where its spectra are greatest (of what can fluoresce it peaks at " + p.at + ")"
			}
			add(c, "peak-open", eem.Doubt, nan, fmt.Sprintf("the data do not determine %s %s, so that its contributions have no sure scale; too much of it lies under scatter or beyond the scans", c.Name, where))
		}
		if p.hidden {
			add(c, "peak-unseen", eem.Remark, p.share, fmt.Sprintf("the spectra of %s are greatest together at %s, where emission is not longer than excitation and nothing fluoresces; of what can be seen it peaks at %s, at %.0f %% of that, and its contributions are intensities that no bottle shows; it may be scatter, or one component too many", c.Name, p.own, p.at, 100*p.share))
		}
	}
}

// unseen names the components of a fit whose spectra are greatest where nothing
// fluoresces.
func (j *job) unseen(r *parafac.Result) string {
	var names []string
	for f := range r.Components {
		if peakOf(r.Grid, r.Ex[f], r.Em[f]).hidden {
			names = append(names, j.nameIn(r.Components, f))
		}
	}
	return strings.Join(names, ", ")
}
