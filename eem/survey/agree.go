package survey

import (
	"fmt"
	"slices"
)

// agree reports settings that are right by themselves and wrong together. at is
// the path of the setup whose settings s are, nil for the survey's own.
func (r *settingsReader) agree(s *Settings, at []string) {
	path := func(p ...string) []string {
		if at != nil {
			return at
		}
		return p
	}
	if msg := ramanWindow(s.Intensity); msg != "" {
		p := path("intensity", "window_nm")
		if !r.stands(p) {
			p = path("intensity", "excitation_nm")
		}
		r.add(p, "%s", msg)
	}
	r.cell(s.Correct, at, path)
	if at != nil {
		return
	}
	switch o := s.Optics; {
	case o.YieldStandard != "" && !o.Yield.Given:
		r.add(path("optics", "yield_standard"), `a yield standard needs its quantum yield; add yield = … and yield_source = "…" below it`)
	case o.Yield.Given && o.YieldSource == "":
		r.add(path("optics", "yield"), `a quantum yield depends on the medium; add yield_source = "medium, and where the value comes from" below it`)
	}
	if c := s.Resolve; c.Choose > 0 {
		if c.Because == "" {
			r.add(path("resolve", "choose"), `a number chosen by hand needs its reason; add because = "…" below it`)
		}
		if c.Components.Mode != "off" && (c.Choose < c.Components.From || c.Choose > c.Components.To) {
			r.add(path("resolve", "choose"), "%d is not among the numbers of components, %d to %d; set components = [%d, %d]",
				c.Choose, c.Components.From, c.Components.To,
				min(c.Choose, c.Components.From), max(c.Choose, c.Components.To))
		}
	}
}

// cell reports windows that do not lie in the measuring cell, and angles of a cell
// that has none; for a setup only where it changes one of them.
func (r *settingsReader) cell(c Correct, at []string, path func(...string) []string) {
	changes := func(names ...string) bool {
		return at == nil || slices.ContainsFunc(names, func(n string) bool { return r.stands(append(slices.Clone(at), "correct", n)) })
	}
	window := func(name string, cm [2]float64) {
		if cm[1] > c.CellCM && changes(name, "cell_cm") {
			r.add(path("correct", name), "[%g, %g] does not lie in a cell of %g cm; correct it, or set cell_cm to the inner width of the cell", cm[0], cm[1], c.CellCM)
		}
	}
	window("excitation_window_cm", c.ExcitationWindowCM)
	window("emission_window_cm", c.EmissionWindowCM)
	slanted := func(name string, deg float64) {
		if deg != 0 && c.InnerFilter == "right-angle" && changes(name, "inner_filter") {
			r.add(path("correct", name), `a right-angle cell is lit and seen straight on; set inner_filter = "front-face", or leave the angles out`)
		}
	}
	slanted("incidence_deg", c.IncidenceDeg)
	slanted("observation_deg", c.ObservationDeg)
}

// ramanWindow says that water's Raman line lies outside the window in which it is
// to be integrated, which happens when the excitation is changed and the window
// is not. The line is at 3400 cm⁻¹ (METHODS 2.5, computed there); the remedy is
// the window 371–428 nm of excitation 350 nm taken as the shifts that it spans,
// 1617 to 5207 cm⁻¹.
func ramanWindow(i Intensity) string {
	const nmPerCM = 1e7
	em := func(shift float64) float64 { return 1 / (1/i.ExcitationNM - shift/nmPerCM) }
	if line := em(3400); line < i.WindowNM[0] || line > i.WindowNM[1] {
		return fmt.Sprintf("water's Raman line excited at %g nm lies at %.0f nm, outside the window; set window_nm = [%.0f, %.0f]",
			i.ExcitationNM, line, em(1617), em(5207))
	}
	return ""
}
