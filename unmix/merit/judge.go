package merit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Bottle is what the judgement of a bottle needs to know from before.
type Bottle struct {
	ID, Batch string
	Doubts    []string // in words; any makes the contributions unreliable
	// Of holds doubts on single components: of their spectra, of their standards.
	Of       map[string][]string
	Rejects  []string // in words; any makes them not usable
	Row      int      // of the resolution; −1 when the bottle is not in it
	Unlike   bool     // a bottle that need not look like the model (a blank): no test of the residual
	Standard bool     // a standard: the highest one is not above itself
	Lines    []Line   // scatter lines along which light may be left
}

// Currie's factors for known standard deviation and 5 % errors of both kinds
// (Currie 1968, Anal. Chem. 40, 586): decision, detection, quantification.
const (
	kCritical = 1.6448536269514722
	kDetect   = 2 * kCritical
	kQuantify = 10
)

// Judged is a resolution put into words.
type Judged struct {
	Contributions []unmix.Contribution
	Flags         []eem.Flag
	Structure     []Moran  // one a bottle; zero where it is not in the resolution
	Spreads       []Spread // one a row of the resolution
	Tested        int      // bottles whose residual was tested
	Searched      int      // bottles that were searched for an unknown

	Unknown []*Unknown           // what was found beyond the model
	Beyond  []unmix.Contribution // its contributions, bottle after bottle
}

// Judge makes one contribution for every bottle and component. spreads are those of
// the resolution's rows, x returns the cells of one, limit the limit of a test.
func Judge(r *unmix.Resolution, spreads []Spread, bottles []Bottle, x func(row int) []float64, limit func(code string) float64, accept func(eem.Flag) eem.Flag, model string) *Judged {
	j := &Judged{Structure: make([]Moran, len(bottles)), Spreads: spreads}
	dst := make([]float64, r.Set.Grid.Cells())
	for i, b := range bottles {
		doubts, rejects := b.Doubts, b.Rejects
		if b.Row >= 0 {
			r.ResidualTo(dst, x(b.Row), b.Row)
			j.Structure[i] = MoranI(dst, r.Set.Grid.Ex.Len(), r.Set.Grid.Em.Len())
			switch {
			case nothingLeft(&r.Fits[b.Row], &spreads[b.Row]):
				j.Structure[i] = untested(j.Structure[i].N)
			case r.Fits[b.Row].Usable && !b.Unlike:
				j.Tested++
			}
			for _, f := range fitFlags(r, &spreads[b.Row], b, j.Structure[i], limit) {
				f = accept(f)
				j.Flags = append(j.Flags, f)
				switch f.Severity {
				case eem.Doubt:
					doubts = append(doubts[:len(doubts):len(doubts)], f.Msg)
				case eem.Reject:
					rejects = append(rejects[:len(rejects):len(rejects)], f.Msg)
				}
			}
		}
		for f := range r.Set.Components {
			c, flags := contribution(r, spreads, b, f, doubts, rejects, accept)
			c.Model = model
			j.Contributions = append(j.Contributions, c)
			j.Flags = append(j.Flags, flags...)
		}
	}
	j.addSums(r, bottles, accept, model)
	return j
}

// fitFlags are the tests of one bottle's fit.
func fitFlags(r *unmix.Resolution, s *Spread, b Bottle, m Moran, limit func(string) float64) []eem.Flag {
	fit := r.Fits[b.Row]
	var out []eem.Flag
	add := func(code string, sev eem.Severity, v, lim float64, msg string) {
		out = append(out, eem.NewFlag(eem.Flag{ID: b.ID, Batch: b.Batch, Method: r.Set.Method, Test: code, Severity: sev, Value: v, Limit: lim, Msg: msg}))
	}
	if !fit.Usable {
		add("few-cells", eem.Reject, float64(fit.Cells), float64(r.Set.Len()), fit.Reason)
		return out
	}
	if lim := limit("overlap"); fit.Condition > lim {
		add("overlap", eem.Doubt, fit.Condition, lim, fmt.Sprintf("components overlap so much (condition number %.3g) that their shares are not sure; their sum is", fit.Condition))
	}
	if b.Unlike {
		return out
	}
	score := s.Yard.Score(m.Z)
	structured := score > limit("structure")
	lines := leftover(s.Tops, b.Lines)
	if lim := limit("unexplained"); structured && fit.Explained < 100*lim {
		what := fmt.Sprintf("something in this bottle is not in the model, which explains %.1f %% of the signal", fit.Explained)
		if len(lines) > 0 {
			what = fmt.Sprintf("scatter is left in this bottle: what the model leaves over lies %s; the model explains %.1f %% of the signal; %s", along(lines), fit.Explained, remedy(lines))
		}
		add("unexplained", eem.Doubt, fit.Explained/100, lim,
			fmt.Sprintf("%s; the residual is largest at ex %s / em %s nm%s%s", what, eem.NM(fit.HotEx), eem.NM(fit.HotEm), eem.InDetail, s.residual()))
	} else if structured {
		where := ""
		if len(lines) > 0 {
			where = "; scatter is left " + along(lines) + "; " + remedy(lines)
		}
		add("structure", eem.Remark, score, limit("structure"), fmt.Sprintf("the residual is not noise alone (by chance one bottle in %s shows such), largest at ex %s / em %s nm%s%s%s",
			digits(1/distuv.UnitNormal.Survival(limit("structure")), 2), eem.NM(s.Hot.Ex), eem.NM(s.Hot.Em), where, eem.InDetail, s.residual()))
	}
	return out
}

// residual tells in words how the residual compares with the noise, and which
// yardstick that was.
func (s *Spread) residual() string {
	text := s.Hot.String()
	if s.ChiSquare == s.ChiSquare {
		text += fmt.Sprintf("; its variance is %s times that of the noise model", digits(s.ChiSquare, 3))
		if s.Runs == s.Runs {
			text += ", runs along emission Z " + digits(s.Runs, 2)
		}
	}
	return text + "; " + heldAgainst(s.Yard)
}

// contribution judges component f of bottle b.
func contribution(r *unmix.Resolution, spreads []Spread, b Bottle, f int, doubts, rejects []string, accept func(eem.Flag) eem.Flag) (unmix.Contribution, []eem.Flag) {
	comp := r.Set.Components[f]
	nan := math.NaN()
	c := unmix.Contribution{ID: b.ID, Component: comp.Name, Method: r.Set.Method, Unit: comp.AmountUnit,
		Value: nan, U: nan, Lower: nan, Upper: nan, Detection: nan, Critical: nan, Quantification: nan}
	if c.Unit == "" {
		c.Unit = string(r.Set.Unit)
	}
	if b.Row >= 0 {
		s := &spreads[b.Row]
		c.Value, c.U = r.Value[b.Row*r.Set.Len()+f], s.U[f]
		if c.Lower, c.Upper = s.Lower[f], s.Upper[f]; c.Lower < 1e-9*c.Upper {
			c.Lower = 0 // what rounding left
		}
		c.Critical, c.Detection, c.Quantification = s.Critical[f], s.Detection[f], s.Quantifiable[f]
		c.Detected = c.Value > c.Critical
	}
	if len(rejects) > 0 || math.IsNaN(c.Value) {
		c.Qualifier, c.Detected, c.Reasons = unmix.NotUsable, false, rejects
		c.Reported = "not usable"
		return c, nil
	}
	var flags []eem.Flag
	c.Reasons = append(c.Reasons, doubts...)
	c.Reasons = append(c.Reasons, b.Of[comp.Name]...)
	if c.Detected && c.Value < kCritical*c.U {
		c.Reasons = append(c.Reasons, "its standard uncertainty is so large that the interval reaches zero")
	}
	if comp.Highest > 0 && !b.Standard && c.Value-2*notNaN(c.U) > comp.Highest {
		fl := accept(eem.Flag{ID: b.ID, Batch: b.Batch, Component: comp.Name, Method: r.Set.Method, Test: "above-standards", Severity: eem.Doubt,
			Value: c.Value, Limit: comp.Highest, Msg: fmt.Sprintf("%s: %.4g %s is above the highest standard (%.4g)", comp.Name, c.Value, c.Unit, comp.Highest)})
		flags = append(flags, fl)
		if fl.Severity == eem.Doubt {
			c.Reasons = append(c.Reasons, "above the highest standard")
		}
	}
	switch {
	case !c.Detected:
		c.Qualifier = unmix.NotDetected
		c.Reported = "< " + digits(c.Detection, 2)
		if math.IsNaN(c.Detection) {
			c.Reported = "not detected"
		}
	case len(c.Reasons) > 0:
		c.Qualifier = unmix.Unreliable
		c.Reported = Rounded(c.Value, c.Expanded(), StatedDigits)
	default:
		c.Reported = Rounded(c.Value, c.Expanded(), StatedDigits)
	}
	return c, flags
}

// notNaN is v, 0 where it is not known.
func notNaN(v float64) float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return 0
	}
	return v
}
