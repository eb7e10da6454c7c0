package merit

import (
	"fmt"
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
	Set        *unmix.Set        // the model with the unknown held, last
	Resolution *unmix.Resolution // by that set: the other answer
	Spreads    []Spread
	Z          []float64 // by row: its contribution over what it would scatter by without any; NaN where the row was not searched
	Limit      float64   // of Z
	Shown      []int     // rows that show it
}

// FalseUnknowns is the share of surveys without an unknown in which one is found by
// chance, if residuals are noise and the causes of the budget alone.
const FalseUnknowns = 0.01

// least is the smallest Z that counts whatever the number of bottles: the noise
// model and the causes are themselves known to some ten percent.
const least = 5

// FindUnknown searches the residuals of the given rows for one more component by a
// non-negative rank-one fit, ex × em times an amount a row, with the other amounts
// free. Its spectra are made from one half of the cells (of a chequerboard) and
// judged on the other half, so that noise does not vouch for itself; it is shown by
// a row where Z exceeds the normal quantile of FalseUnknowns over the number of
// rows, both halves agreeing. It returns nil where no row shows one, where the noise
// is not known, or where the component looks like one of the model (congruence above
// 0.99).
func FindUnknown(c *eem.Cube, r *unmix.Resolution, rows []int, src *Sources, spreads []Spread) (*Unknown, error) {
	s := newSearch(c, r, rows, spreads)
	if len(s.rows) == 0 || len(s.cells) < 10 {
		return nil, nil
	}
	limit := math.Max(least, TQuantile(1-FalseUnknowns/float64(2*len(s.rows)), 0))
	z := s.crossed()
	if !(slices.Max(z) > limit) {
		return nil, nil
	}
	ex, em, ok := s.fit(s.everywhere(), s.start(s.everywhere()))
	if !ok {
		return nil, nil
	}
	u, err := s.hold(ex, em, src)
	if u == nil || err != nil {
		return nil, err
	}
	u.Limit, u.Z = limit, nans(c.Len())
	f := r.Set.Len()
	for n, row := range s.rows {
		sp := &u.Spreads[row]
		if !(sp.Critical[f] > 0) {
			continue
		}
		// z knows the noise of the cells only; the budget knows the other causes.
		full := u.Resolution.Value[row*(f+1)+f] / (sp.Critical[f] / kCritical)
		u.Z[row] = math.Min(z[n], full)
		if u.Z[row] > limit {
			u.Shown = append(u.Shown, row)
		}
	}
	if u.Shown == nil {
		return nil, nil
	}
	return u, nil
}

// FindUnknowns is FindUnknown, and once more with the first held.
func FindUnknowns(c *eem.Cube, r *unmix.Resolution, rows []int, src *Sources, spreads []Spread) ([]*Unknown, error) {
	var out []*Unknown
	for range 2 {
		u, err := FindUnknown(c, r, rows, src, spreads)
		if u == nil || err != nil {
			return out, err
		}
		out = append(out, u)
		r, spreads = u.Resolution, u.Spreads
	}
	return out, nil
}

// search holds the residuals of the rows over their noise.
type search struct {
	c     *eem.Cube
	r     *unmix.Resolution
	rows  []int
	cells []int       // of the model
	res   [][]float64 // by row, cells long, in units of the row's noise; NaN missing
	w     []float64   // by cell: one over the variance of the residuals in those units
	a     []float64   // cells × n, the model
	n     int
}

func newSearch(c *eem.Cube, r *unmix.Resolution, rows []int, spreads []Spread) *search {
	s := &search{c: c, r: r, n: r.Set.Len()}
	s.a, s.cells = r.Set.Matrix()
	dst := make([]float64, c.Cells())
	for _, row := range rows {
		if !r.Fits[row].Usable || !(spreads[row].NoiseRMS > 0) {
			continue
		}
		r.ResidualTo(dst, c.Sample(row), row)
		v := make([]float64, len(s.cells))
		why := c.SampleWhy(row)
		for l, cell := range s.cells {
			v[l] = math.NaN()
			if why[cell] == eem.Measured {
				v[l] = dst[cell] / spreads[row].NoiseRMS
			}
		}
		s.rows, s.res = append(s.rows, row), append(s.res, v)
	}
	s.weigh(spreads)
	return s
}

// weigh sets the weights of the cells from the mean over the rows of their noise.
func (s *search) weigh(spreads []Spread) {
	s.w = make([]float64, len(s.cells))
	n := make([]float64, len(s.cells))
	for _, row := range s.rows {
		u := s.c.SampleU(row)
		for l, cell := range s.cells {
			if v := float64(u[cell]) / spreads[row].NoiseRMS; v > 0 {
				s.w[l], n[l] = s.w[l]+v*v, n[l]+1
			}
		}
	}
	for l, v := range s.w {
		if v > 0 {
			s.w[l] = n[l] / v
		}
	}
}

func (s *search) everywhere() []int {
	return all(len(s.cells))
}

// half lists the cells of one colour of a chequerboard.
func (s *search) half(colour int) []int {
	var out []int
	nk := s.c.Em.Len()
	for l, cell := range s.cells {
		if (cell/nk+cell%nk)%2 == colour {
			out = append(out, l)
		}
	}
	return out
}

// crossed returns, by row, the smaller of the two Z of spectra made on one half of
// the cells and judged on the other.
func (s *search) crossed() []float64 {
	out := make([]float64, len(s.rows))
	for i := range out {
		out[i] = math.Inf(1)
	}
	for colour := range 2 {
		make1, judge := s.half(colour), s.half(1-colour)
		ex, em, ok := s.fit(make1, s.start(make1))
		for i := range out {
			z := 0.0
			if ok {
				z = s.z(i, ex, em, judge)
			}
			out[i] = math.Min(out[i], z)
		}
	}
	return out
}

// template is ex × em on the given cells, and what the model does not take of it:
// p = m − K(K'K)⁻¹K'm.
func (s *search) template(ex, em []float64, use []int) (m, p []float64) {
	nk := s.c.Em.Len()
	m = make([]float64, len(use))
	gram, km := make([]float64, s.n*s.n), make([]float64, s.n)
	for i, l := range use {
		cell := s.cells[l]
		m[i] = ex[cell/nk] * em[cell%nk]
		k := s.a[l*s.n : (l+1)*s.n]
		addOuter(gram, k, 1)
		axpy(m[i], k, km)
	}
	inv := inverse(gram, s.n, all(s.n))
	p = slices.Clone(m)
	if inv == nil {
		return m, p
	}
	x := make([]float64, s.n)
	for f := range x {
		for h, v := range km {
			x[f] += inv[f*s.n+h] * v
		}
	}
	for i, l := range use {
		for f, v := range x {
			p[i] -= v * s.a[l*s.n+f]
		}
	}
	return m, p
}

// amount is the least-squares amount of the template that the model leaves, in units
// of the row's noise, and its standard deviation by noise.
func (s *search) amount(i int, p []float64, use []int) (a, sd float64) {
	var num, den float64
	for q, l := range use {
		if v := s.res[i][l]; v == v {
			num, den = num+s.w[l]*p[q]*v, den+s.w[l]*p[q]*p[q]
		}
	}
	if den == 0 {
		return 0, math.Inf(1)
	}
	return num / den, 1 / math.Sqrt(den)
}

func (s *search) z(i int, ex, em []float64, use []int) float64 {
	_, p := s.template(ex, em, use)
	a, sd := s.amount(i, p, use)
	return a / sd
}

// start is the map to start from: the mean of the residuals of the bottles that
// leave most, weighted by how much more than noise they leave.
func (s *search) start(use []int) []float64 {
	out := make([]float64, len(use))
	for i := range s.rows {
		ss, n := 0.0, 0.0
		for _, l := range use {
			if v := s.res[i][l]; v == v {
				ss, n = ss+s.w[l]*v*v, n+1
			}
		}
		w := math.Max(0, ss/math.Max(1, n)-1)
		for q, l := range use {
			if v := s.res[i][l]; v == v {
				out[q] += w * w * v
			}
		}
	}
	return out
}

// fit alternates amounts and spectra. Of a template m the model leaves p; with the
// amounts a that rows show of it, the mean of their residuals is what is wrong with
// p, so that the next m is the nearest non-negative ex × em to m_old − (what of it
// rows do not show). It says false where nothing positive is left.
func (s *search) fit(use []int, from []float64) (ex, em []float64, ok bool) {
	const rounds = 40
	target := from
	for range rounds {
		ex, em = s.rankOne(target, use)
		if slices.Max(ex) == 0 || slices.Max(em) == 0 {
			return ex, em, false
		}
		m, p := s.template(ex, em, use)
		mean, weight := make([]float64, len(use)), make([]float64, len(use))
		for i := range s.rows {
			a, _ := s.amount(i, p, use)
			if a <= 0 {
				continue
			}
			for q, l := range use {
				if v := s.res[i][l]; v == v {
					mean[q] += a * v
					weight[q] += a * a
				}
			}
		}
		target = make([]float64, len(use))
		for q := range target {
			if weight[q] > 0 {
				target[q] = m[q] - p[q] + mean[q]/weight[q]
			}
		}
	}
	return ex, em, true
}

// rankOne returns the non-negative ex × em, of maximum 1, nearest to a map on the
// cells use, by alternating least squares; loadings that no cell shows are 0.
func (s *search) rankOne(m []float64, use []int) (ex, em []float64) {
	nj, nk := s.c.Ex.Len(), s.c.Em.Len()
	ex, em = make([]float64, nj), make([]float64, nk)
	for k := range em {
		em[k] = 1
	}
	nx, dx := make([]float64, nj), make([]float64, nj)
	nm, dm := make([]float64, nk), make([]float64, nk)
	for range 30 {
		clear(nx)
		clear(dx)
		for q, l := range use {
			j, k := s.cells[l]/nk, s.cells[l]%nk
			nx[j], dx[j] = nx[j]+s.w[l]*m[q]*em[k], dx[j]+s.w[l]*em[k]*em[k]
		}
		positivePart(ex, nx, dx)
		clear(nm)
		clear(dm)
		for q, l := range use {
			j, k := s.cells[l]/nk, s.cells[l]%nk
			nm[k], dm[k] = nm[k]+s.w[l]*m[q]*ex[j], dm[k]+s.w[l]*ex[j]*ex[j]
		}
		positivePart(em, nm, dm)
	}
	return ex, em
}

// seen is the share of the best-seen loading's information that halves a loading
// (a ridge): those that hardly any cell shows would be noise over nothing.
const seen = 0.02

// positivePart sets dst = num/(den + ridge), not below 0, at a maximum of 1.
func positivePart(dst, num, den []float64) {
	top := 0.0
	ridge := seen * slices.Max(den)
	for i := range dst {
		dst[i] = 0
		if den[i] > 0 {
			dst[i] = math.Max(0, num[i]/(den[i]+ridge))
		}
		top = math.Max(top, dst[i])
	}
	if top > 0 {
		for i := range dst {
			dst[i] /= top
		}
	}
}

// hold resolves the cube with the unknown held beside the components.
func (s *search) hold(ex, em []float64, src *Sources) (*Unknown, error) {
	for _, c := range s.r.Set.Components {
		if math.Min(congruence(c.Ex, ex), congruence(c.Em, em)) > 0.99 {
			return nil, nil
		}
	}
	u := &Unknown{ExNM: s.c.Ex.At(peak(ex)), EmNM: s.c.Em.At(peak(em))}
	u.Component = unmix.Component{Name: fmt.Sprintf("unknown %g/%g", u.ExNM, u.EmNM), Ex: ex, Em: em, Scale: 1}
	set := *s.r.Set
	set.Components = append(slices.Clone(s.r.Set.Components), u.Component)
	u.Set = &set
	var err error
	if u.Resolution, err = unmix.Quantify(s.c, &set); err != nil {
		return nil, err
	}
	u.Spreads = Spreads(s.c, u.Resolution, src)
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
