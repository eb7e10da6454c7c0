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
