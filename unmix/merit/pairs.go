package merit

import (
	"fmt"
	"math"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// addSums reports pairs that cannot be told apart as their sum: a contribution of the
// sum to every bottle, one flag a pair, and each of the two, where it is detected,
// only as part of the sum. Where the settings accept the overlap (the way to ask for
// them apart) both stay as they are.
func (j *Judged) addSums(r *unmix.Resolution, bottles []Bottle, accept func(eem.Flag) eem.Flag, model string) {
	n := r.Set.Len()
	for at, p := range Pairs(r.Set) {
		a, c := r.Set.Components[p.F].Name, r.Set.Components[p.H].Name
		name := a + " + " + c
		f := accept(eem.NewFlag(eem.Flag{Component: name, Method: r.Set.Method, Test: "overlap", Severity: eem.Doubt, Value: p.Correlation, Limit: -math.Sqrt(1 - 1.0/maxVIF),
			Msg: fmt.Sprintf("%s and %s cannot be told apart on these wavelengths (their estimates are correlated by %.3f), so that their sum is reported; for both apart accept this test with a reason", a, c, p.Correlation)}))
		j.Flags = append(j.Flags, f)
		if f.Severity < eem.Doubt {
			continue
		}
		for i, b := range bottles {
			j.Beyond = append(j.Beyond, j.sum(r, b, i, at, p.F, name, model)) // before the reasons below are added
			for _, g := range []int{p.F, p.H} {
				k := &j.Contributions[i*n+g]
				if k.Qualifier == unmix.NotUsable {
					continue
				}
				k.Reasons = append(k.Reasons[:len(k.Reasons):len(k.Reasons)], "cannot be told apart from "+map[bool]string{true: c, false: a}[g == p.F])
				if k.Detected {
					k.Qualifier, k.Reported = unmix.Unreliable, "see "+name
				}
			}
		}
	}
}

// sum is the contribution of a pair to bottle b, number i. Its doubts are those of the
// first of the two.
func (j *Judged) sum(r *unmix.Resolution, b Bottle, i, at, f int, name, model string) unmix.Contribution {
	nan := math.NaN()
	first := j.Contributions[i*r.Set.Len()+f]
	c := unmix.Contribution{ID: b.ID, Component: name, Method: r.Set.Method, Unit: first.Unit, Model: model, Reasons: first.Reasons,
		Value: nan, U: nan, Lower: nan, Upper: nan, Detection: nan, Critical: nan, Quantification: nan}
	if first.Qualifier == unmix.NotUsable || b.Row < 0 || len(j.Spreads[b.Row].Sums) <= at {
		c.Qualifier, c.Reported = unmix.NotUsable, "not usable"
		return c
	}
	s := j.Spreads[b.Row].Sums[at]
	c.Value, c.U, c.Lower, c.Upper = s.Value, s.U, s.Lower, s.Upper
	c.Critical, c.Detection, c.Quantification = s.Critical, s.Detection, s.Quantifiable
	c.Detected = c.Value > c.Critical
	switch {
	case !c.Detected:
		c.Qualifier, c.Reported = unmix.NotDetected, "< "+digits(c.Detection, 2)
	case len(c.Reasons) > 0:
		c.Qualifier, c.Reported = unmix.Unreliable, Rounded(c.Value, c.Expanded(), StatedDigits)
	default:
		c.Reported = Rounded(c.Value, c.Expanded(), StatedDigits)
	}
	return c
}
