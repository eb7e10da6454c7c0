package merit

import (
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Unknown is a component that the model lacks, found in what it leaves over. It has
// spectra and no name but where they peak.
type Unknown struct {
	Component  unmix.Component
	ExNM, EmNM float64           // where it peaks
	ExU, EmU   float64           // standard errors of that by noise, nm; NaN where it is the plain maximum
	Set        *unmix.Set        // the model with the unknown held, last
	Resolution *unmix.Resolution // by that set: the other answer
	Spreads    []Spread
	Z          []float64 // by row: its contribution over what it would scatter by without any (of the noise alone where that is under Limit); NaN where the row was not searched
	Limit      float64   // of Z
	Shown      []int     // rows that show it
}

// FalseUnknowns is the share of surveys without an unknown in which one is found by
// chance, if residuals are noise and the causes of the budget alone.
const FalseUnknowns = 0.01

// least is the smallest Z that counts whatever the number of bottles: the noise
// model and the causes are themselves known to some ten percent.
const least = 5

// FindUnknowns searches the residuals of the given rows for one more component by a
// non-negative rank-one fit, ex × em times an amount a row, with the other amounts
// free, and for a second one with the first held. Its spectra are made from one half
// of the cells (of a chequerboard) and judged on the other half, so that noise does
// not vouch for itself; it is shown by a row where Z exceeds the normal quantile of
// FalseUnknowns over the number of rows, both halves agreeing. It finds none where no
// row shows one, where the noise is not known, or where the component looks like one
// of the model (congruence above 0.99). The last one's Spreads are complete, those of
// one before it only in rows that could show it.
func FindUnknowns(c *eem.Cube, r *unmix.Resolution, rows []int, src *Sources, spreads []Spread) ([]*Unknown, error) {
	const most = 2
	var out []*Unknown
	for len(out) < most {
		u, err := findUnknown(c, r, rows, src, spreads)
		if err != nil {
			return nil, err
		}
		if u == nil {
			break
		}
		out = append(out, u)
		r = u.Resolution
	}
	if out != nil {
		last := out[len(out)-1]
		last.Spreads = Spreads(c, last.Resolution, src)
	}
	return out, nil
}

// findUnknown is one round; spreads give the noise of the rows.
func findUnknown(c *eem.Cube, r *unmix.Resolution, rows []int, src *Sources, spreads []Spread) (*Unknown, error) {
	s := newSearch(c, r, rows, spreads)
	if len(s.rows) == 0 || len(s.cells) < 10 {
		return nil, nil
	}
	limit := math.Max(least, TQuantile(1-FalseUnknowns/float64(2*len(s.rows)), 0))
	z := s.crossed(limit)
	if z == nil {
		return nil, nil
	}
	ex, em, last := s.fit(s.whole, s.start(s.whole))
	if last == nil {
		return nil, nil
	}
	u, err := s.hold(last.loadings(ex, em))
	if u == nil || err != nil {
		return nil, err
	}
	u.Limit = limit
	s.judge(u, z, src)
	if u.Shown == nil {
		return nil, nil
	}
	return u, nil
}

// judge fills Z and Shown. z knows the noise of the cells only; the budget knows the
// other causes, and is made where z alone does not rule the row out.
func (s *search) judge(u *Unknown, z []float64, src *Sources) {
	var may []int
	for n, row := range s.rows {
		if z[n] > u.Limit {
			may = append(may, row)
		}
	}
	u.Spreads = spreadsOf(s.c, u.Resolution, src, may)
	u.Z = nans(s.c.Len())
	f := s.r.Set.Len()
	for n, row := range s.rows {
		u.Z[row] = z[n]
		if !(z[n] > u.Limit) {
			continue
		}
		sp := &u.Spreads[row]
		if !(sp.Critical[f] > 0) {
			u.Z[row] = math.NaN()
			continue
		}
		full := u.Resolution.Value[row*(f+1)+f] / (sp.Critical[f] / kCritical)
		if u.Z[row] = math.Min(z[n], full); u.Z[row] > u.Limit {
			u.Shown = append(u.Shown, row)
		}
	}
}

// hold resolves the cube with the unknown held beside the components.
func (s *search) hold(ex, em *loading) (*Unknown, error) {
	for _, c := range s.r.Set.Components {
		if math.Min(congruence(c.Ex, ex.v), congruence(c.Em, em.v)) > 0.99 {
			return nil, nil
		}
	}
	u := &Unknown{}
	u.ExNM, u.ExU = ex.peak(s.c.Ex)
	u.EmNM, u.EmU = em.peak(s.c.Em)
	onGrid := func(a eem.Axis, nm float64) string { return eem.NM(a.At(a.Nearest(nm))) }
	u.Component = unmix.Component{Name: "unknown " + onGrid(s.c.Ex, u.ExNM) + "/" + onGrid(s.c.Em, u.EmNM), Ex: ex.v, Em: em.v, Scale: 1}
	set := *s.r.Set
	set.Components = append(slices.Clone(s.r.Set.Components), u.Component)
	u.Set = &set
	var err error
	if u.Resolution, err = unmix.Quantify(s.c, &set); err != nil {
		return nil, err
	}
	return u, nil
}

// congruence is Tucker's, over entries that both have.
func congruence(a, b []float64) float64 {
	var ab, aa, bb float64
	for i, x := range a {
		if y := b[i]; x == x && y == y {
			ab, aa, bb = ab+x*y, aa+x*x, bb+y*y
		}
	}
	return ab / math.Sqrt(aa*bb)
}
