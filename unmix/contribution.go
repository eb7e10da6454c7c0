package unmix

// Contribution is one row of contributions.csv: what one method says about one
// component in one bottle. Numbers that do not exist are NaN.
type Contribution struct {
	ID, Component, Method string
	Value                 float64 // never negative, censored or rounded
	Unit                  string
	U                     float64 // standard uncertainty
	Lower, Upper          float64 // of the 95 % interval
	Detection             float64 // detection limit
	Critical              float64 // critical value: above it the component is detected
	Quantification        float64 // quantification limit
	Detected              bool
	Qualifier             string // "", U not detected, J unreliable, R not usable
	Reported              string // for reading: rounded, or "< detection limit"
	Reasons               []string
	Model                 string // what it was resolved against
}

// The qualifiers of a contribution.
const (
	NotDetected = "U"
	Unreliable  = "J"
	NotUsable   = "R"
)

// Expanded is the half-width of what stands behind ±: see ExpandedOf.
func (c *Contribution) Expanded() float64 { return ExpandedOf(c.Value, c.U, c.Lower, c.Upper) }

// ExpandedOf is the expanded uncertainty k·u of a value: k = 2, or more where the 95 %
// interval reaches further to one side, as it does when the standard uncertainty u
// rests on few degrees of freedom (JCGM 100:2008, G.4; EA-4/02 M:2022, 5). An end at
// zero, where the interval is cut, does not count. It is NaN where u is.
func ExpandedOf(value, u, lower, upper float64) float64 {
	half := 2 * u
	if upper-value > half {
		half = upper - value
	}
	if lower > 0 && value-lower > half {
		half = value - lower
	}
	return half
}

// Doubt adds reasons why the value is unreliable. One that is not usable stays
// that, and one that is not detected stays below its limit.
func (c *Contribution) Doubt(reasons ...string) {
	if len(reasons) == 0 || c.Qualifier == NotUsable {
		return
	}
	c.Reasons = append(c.Reasons[:len(c.Reasons):len(c.Reasons)], reasons...)
	if c.Detected {
		c.Qualifier = Unreliable
	}
}
