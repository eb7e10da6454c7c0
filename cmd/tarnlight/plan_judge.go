package main

import (
	"fmt"
	"slices"
	"strings"

	"tarnlight/eem"
)

// judge says which plan to take.
func (r *planResult) judge(limits map[string]float64) {
	r.taken = -1
	if len(limits) > 0 {
		r.judgeLimits()
		return
	}
	best := r.best()
	if best < 0 {
		r.doubt = true
		r.Verdict = fmt.Sprintf("no plan of up to %s tells all components apart; plan for more (--scans), or leave components out", eem.Count(r.Plans[len(r.Plans)-1].Scans, "scan"))
		return
	}
	few := r.fewest(best, r.speaks())
	if few < 0 {
		few = r.fewest(best, 0)
	}
	p := r.Plans[few]
	r.taken = few
	are := "are the fewest"
	if p.Scans == 1 {
		are = "is enough:"
	}
	r.Verdict = fmt.Sprintf("%s at ex %s nm (%.3g min) %s within %.0f %% of the best of these plans%s%s", eem.Count(p.Scans, "scan"), numbersText(p.Excitations), p.Minutes, are, 100*(enough-1), r.loss(p), r.silent(p))
}

// fewest is the first plan of so many scans or more that is nearly as good as the
// best, −1 where there is none.
func (r *planResult) fewest(best, atLeast int) int {
	return slices.IndexFunc(r.Plans, func(p planRow) bool {
		return p.Scans >= atLeast && p.prediction.Cost <= enough*r.Plans[best].prediction.Cost
	})
}

// speaks is how many scans a suggested plan needs where the samples are known to
// depart from the model: one more than components, so that the excitation profile of
// what is in none of them has a part that no mixture of theirs explains. 0 where
// nothing is known of departures.
func (r *planResult) speaks() int {
	if !r.in.departs {
		return 0
	}
	return min(len(r.Full.Components)+1, r.Full.Scans)
}

// silent warns of a plan of fewer scans than that.
func (r *planResult) silent(p planRow) string {
	n := r.speaks()
	if p.Scans >= n {
		return ""
	}
	return fmt.Sprintf("; not recommended: the samples depart from the model, and fewer than %s (components + 1) show little of that; plan for %d or more (--scans)", eem.Count(n, "scan"), n)
}

// loss says how much higher than with all scans the detection limit of the component
// is that loses most.
func (r *planResult) loss(p planRow) string {
	worst, name := 0.0, ""
	for f, c := range p.Components {
		full := r.Full.Components[f].Detection
		if c.Wanted && c.Detection != nil && full != nil && *full > 0 && *c.Detection / *full > worst {
			worst, name = *c.Detection / *full, c.Name
		}
	}
	switch {
	case name == "":
		return ""
	case worst < 1.05:
		return "; detection limits about those of the full grid or lower"
	}
	return fmt.Sprintf("; detection limits up to %s times those of the full grid (%s)", digits3(&worst), name)
}

// best is the plan of least cost, −1 where none tells all components apart.
func (r *planResult) best() int {
	best := -1
	for i, p := range r.Plans {
		if p.Percent != nil && (best < 0 || p.prediction.Cost < r.Plans[best].prediction.Cost) {
			best = i
		}
	}
	return best
}

// judgeLimits names the smallest plan that meets the detection limits, or what keeps
// the plans from it.
func (r *planResult) judgeLimits() {
	for i, p := range r.Plans {
		if p.Meets {
			r.taken = i
			r.Verdict = fmt.Sprintf("the smallest plan that meets the detection limits: %s at ex %s nm, %.3g min%s%s", eem.Count(p.Scans, "scan"), numbersText(p.Excitations), p.Minutes, r.loss(p), r.silent(p))
			return
		}
	}
	r.doubt = true
	last := r.Plans[len(r.Plans)-1]
	r.Verdict = fmt.Sprintf("no plan of up to %s meets the detection limits: %s", eem.Count(last.Scans, "scan"), lacking(last))
	if r.Full.Meets {
		r.Verdict += fmt.Sprintf("; all %d scans do, so that more of them may: --scans", r.Full.Scans)
	} else {
		r.Verdict += fmt.Sprintf("; nor do all %d scans: %s", r.Full.Scans, lacking(r.Full))
	}
}

// lacking says which limits a plan does not meet.
func lacking(p planRow) string {
	var out []string
	for _, c := range p.Components {
		switch {
		case c.Limit == 0:
		case c.Detection == nil:
			out = append(out, c.Name+" is not told apart")
		case *c.Detection > c.Limit:
			out = append(out, fmt.Sprintf("%s %s of %s %s", c.Name, short(*c.Detection), short(c.Limit), c.Unit))
		}
	}
	return strings.Join(out, ", ")
}
