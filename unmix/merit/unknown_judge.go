package merit

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// MethodUnknown is the method of contributions of unknown components.
const MethodUnknown = "unexplained"

// AddUnknowns adds to j, made of r and bottles, what was found beyond the model: a
// contribution of every unknown to every bottle, and a flag on each bottle that shows
// one. It is a doubt, and gives the other answer, where the unknown in the model
// changes a contribution by more than two standard uncertainties. The contributions
// themselves stay as they are: they do not depend on other bottles.
func (j *Judged) AddUnknowns(us []*Unknown, r *unmix.Resolution, bottles []Bottle, accept func(eem.Flag) eem.Flag, model string) {
	if len(us) == 0 {
		return
	}
	j.Unknown = us
	last := us[len(us)-1]
	spreads := sought(last.Spreads, r.Set.Len(), us)
	set := *last.Set
	set.Method = MethodUnknown
	named := *last.Resolution
	named.Set = &set
	for i, b := range bottles {
		for n, u := range us {
			c, _ := contribution(&named, spreads, b, r.Set.Len()+n, b.Doubts, b.Rejects, accept)
			c.Model = model
			j.Beyond = append(j.Beyond, c)
			if b.Row >= 0 && slices.Contains(u.Shown, b.Row) {
				j.flagUnknown(u, r, last, i, b, accept)
			}
		}
	}
}

// sought returns spreads in which an unknown is detected where the search itself would
// say so. It was chosen among all cells and bottles, and stands behind them all: the
// decision for one component in one bottle found it in 10 bottles of the demo's 35,
// one of which holds it.
func sought(spreads []Spread, known int, us []*Unknown) []Spread {
	out := slices.Clone(spreads)
	for i := range out {
		s := &out[i]
		s.Critical, s.Detection = slices.Clone(s.Critical), slices.Clone(s.Detection)
		for n, u := range us {
			if f := known + n; f < len(s.Critical) {
				s0 := s.Critical[f] / kCritical
				s.Critical[f] = u.Limit * s0
				s.Detection[f] += (u.Limit - kCritical) * s0
			}
		}
	}
	return out
}

// flagUnknown tells of unknown u in bottle b, number i.
func (j *Judged) flagUnknown(u *Unknown, r *unmix.Resolution, last *Unknown, i int, b Bottle, accept func(eem.Flag) eem.Flag) {
	n := r.Set.Len()
	f := slices.IndexFunc(last.Set.Components, func(c unmix.Component) bool { return c.Name == u.Component.Name })
	fl := eem.NewFlag(eem.Flag{ID: b.ID, Batch: b.Batch, Component: u.Component.Name, Method: r.Set.Method, Test: "unknown", Severity: eem.Remark,
		Value: u.Z[b.Row], Limit: u.Limit, Msg: fmt.Sprintf("something that the model does not know fluoresces at %s, %s %s high",
			u.Place(), digits(last.Resolution.Value[b.Row*(len(last.Set.Components))+f], 3), r.Set.Unit)})
	var both []string
	for g := range n {
		at := b.Row*len(last.Set.Components) + g
		was, is := r.Value[b.Row*n+g], last.Resolution.Value[at]
		if math.Abs(is-was) > 2*j.Spreads[b.Row].U[g] {
			unit := r.Set.Components[g].AmountUnit
			if unit == "" {
				unit = string(r.Set.Unit)
			}
			both = append(both, fmt.Sprintf("%s %s instead of %s %s", r.Set.Components[g].Name,
				Rounded(is, 2*last.Spreads[b.Row].U[g], StatedDigits), Rounded(was, 2*j.Spreads[b.Row].U[g], StatedDigits), unit))
		}
	}
	if both == nil {
		fl.Msg += "; with it in the model no contribution changes by more than two standard uncertainties"
	} else {
		fl.Severity = eem.Doubt
		fl.Msg += "; with it in the model the bottle holds " + strings.Join(both, ", ")
	}
	fl.Msg += fmt.Sprintf("%sit shows in %s, by chance in one of %.0f surveys", eem.InDetail, eem.Count(len(u.Shown), "bottle"), 1/FalseUnknowns)
	j.Flags = append(j.Flags, accept(fl))
}
