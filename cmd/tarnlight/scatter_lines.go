package main

import (
	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/unmix/merit"
)

// lineNames are the scatter lines in the words of a report.
var lineNames = map[eem.Reason]string{
	eem.Rayleigh1: "Rayleigh line", eem.Rayleigh2: "second-order Rayleigh line",
	eem.Raman1: "water Raman line", eem.Raman2: "second-order water Raman line",
}

// scatterLines are the lines along which a bottle may still hold scattered light, each
// with what helps.
func scatterLines(b *prepare.Bottle) []merit.Line {
	lines, here := b.Lines()
	var out []merit.Line
	for _, l := range lines {
		m := merit.Line{Band: l.Band, Name: lineNames[l.Reason], Remedy: "widen [scatter] " + l.Key}
		switch {
		case !here:
			m.Remedy = "take \"scatter\" out of [scans] applied, so that the bands of [scatter] are left out here too"
		case l.Off:
			m.Remedy = "give [scatter] " + l.Key + " a width, which is \"off\""
		}
		out = append(out, m)
	}
	return out
}
