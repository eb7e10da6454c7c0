package survey

import (
	"fmt"
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
	if at != nil {
		return
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
