package unmix

import (
	"errors"
	"math"
	"slices"

	"tarnlight/eem"
)

// Standard is one corrected bottle of known composition.
type Standard struct {
	ID    string
	Batch string
	EEM   *eem.EEM           // corrected like the samples, any grid
	Conc  map[string]float64 // component → amount in the bottle (0 where named as 0)
}

// FromStandards builds references on grid g: for every cell the slope of
// intensity against amount, through the origin, over the levels of all batches
// (mixtures are resolved by least squares). A standard takes part in a cell only
// where its number was measured, so that clipped and over-absorbing cells are
// left out; a cell where the standards left do not determine a component is NaN.
// names gives the components and their order, units their amounts' units.
func FromStandards(g eem.Grid, unit eem.Unit, names, units []string, standards []Standard) (*Set, []Line, error) {
	if len(standards) == 0 || len(names) == 0 {
		return nil, nil, errors.New("the run sheet has no standard with a concentration; add rows of kind standard with conc: columns, or name a reference file ([quantify] references)")
	}
	slopes, err := slopesByCell(g, names, standards)
	if err != nil {
		return nil, nil, err
	}
	s := &Set{Grid: g, Unit: unit, Method: "references", Origin: "standards of the run sheet"}
	for f, name := range names {
		c := Component{Name: name, AmountUnit: units[f], Surface: slopes[f]}
		c.Ex, c.Em, c.Scale = rankOne(g, c.Surface)
		c.ExDetermined = seen(c.Ex, c.Em, func(j, k int) bool { return !math.IsNaN(c.Surface[g.Index(j, k)]) })
		c.EmDetermined = seen(c.Em, c.Ex, func(k, j int) bool { return !math.IsNaN(c.Surface[g.Index(j, k)]) })
		if c.AmountUnit == "" {
			c.AmountUnit = UnitUnstated
		}
		c.Highest, c.Levels = levels(name, standards)
		s.Components = append(s.Components, c)
	}
	if err := s.Check(); err != nil {
		return nil, nil, err
	}
	return s, s.lines(standards), nil
}

// UnitUnstated stands where the run sheet gives a component's amounts without a unit.
const UnitUnstated = "unstated"

// minSeen is the least share of the other mode's energy that the cells of a
// wavelength must show for its loading to mean anything; below it the loading
// is noise over next to nothing (common practice, no source).
const minSeen = 0.01

// seen says which loadings v the cells present determine.
func seen(v, other []float64, present func(i, l int) bool) []bool {
	out := make([]bool, len(v))
	for i := range v {
		var in, all float64
		for l, o := range other {
			if math.IsNaN(o) {
				continue
			}
			all += o * o
			if present(i, l) {
				in += o * o
			}
		}
		out[i] = !math.IsNaN(v[i]) && in >= minSeen*all
	}
	return out
}

func levels(name string, standards []Standard) (highest float64, n int) {
	var seen []float64
	for _, s := range standards {
		if v := s.Conc[name]; v > 0 && !slices.Contains(seen, v) {
			seen = append(seen, v)
			highest = max(highest, v)
		}
	}
	return highest, len(seen)
}
