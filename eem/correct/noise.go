package correct

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
)

// Noise is the two-term model of a detector's noise: the variance, counts², of
// one cell is
//
//	Read² + Shot·max(0, F − Offset)
//
// with F the counts it reports.
type Noise struct {
	Read   float64 // standard deviation without light, counts
	Shot   float64 // variance per count of light
	Offset float64 // counts without light; 0 after Offset was subtracted
	Blanks int     // replicate blanks it rests on; 0: estimated from one EEM
}

// Var is the variance of a cell that reports f counts.
func (n Noise) Var(f float64) float64 { return n.Read*n.Read + n.Shot*max(0, f-n.Offset) }

// FitNoise estimates the model from three or more replicate blanks of one batch,
// in counts on one grid. Each blank is first brought to their mean by one factor,
// which takes the lamp's drift (the median of blank over mean in the brightest
// fiftieth of the cells, where a spike has no weight); what is left of a cell scatters with the model's
// variance on n−1 degrees of freedom. Cells are grouped by their mean, and the
// group's variance comes from the median of its cells' (divided by the median of
// χ²/ν), so that spikes, bubbles and ridges that moved do not count. The two terms are
// fitted to the groups by weighted least squares, neither below 0.
func FitNoise(blanks []*eem.EEM, offset float64) (Noise, error) {
	const fewest = 3
	if len(blanks) < fewest {
		return Noise{}, fmt.Errorf("%d blanks; the noise model needs %d of one batch", len(blanks), fewest)
	}
	mean, err := Mean(blanks)
	if err != nil {
		return Noise{}, err
	}
	if mean.Unit != eem.Counts {
		return Noise{}, fmt.Errorf("blanks in %s; the noise model needs raw counts", mean.Unit)
	}
	scale := lampScale(blanks, mean, offset)
	var level, variance []float64
	for i, m := range mean.F {
		if v, ok := scaledVariance(blanks, scale, i, m-offset, offset); ok {
			level, variance = append(level, m-offset), append(variance, v)
		}
	}
	n, err := fitGroups(level, variance, float64(len(blanks)-1), len(blanks))
	n.Offset, n.Blanks = offset, len(blanks)
	return n, err
}

// lampScale is how bright each blank is against their mean.
func lampScale(blanks []*eem.EEM, mean *eem.EEM, offset float64) []float64 {
	var bright []int
	for i := range mean.F {
		if measured(mean, i) && mean.F[i] > offset {
			bright = append(bright, i)
		}
	}
	slices.SortStableFunc(bright, func(a, b int) int { return cmp.Compare(mean.F[b], mean.F[a]) })
	bright = bright[:min(len(bright), max(30, len(bright)/50))]
	scale := make([]float64, len(blanks))
	for n, b := range blanks {
		scale[n] = 1
		var ratio []float64
		for _, i := range bright {
			if measured(b, i) {
				ratio = append(ratio, (b.F[i]-offset)/(mean.F[i]-offset))
			}
		}
		if len(ratio) > 0 {
			scale[n] = median(ratio)
		}
	}
	return scale
}

// scaledVariance is the variance of cell i over all blanks around the scaled
// mean, on n−1 degrees of freedom.
func scaledVariance(blanks []*eem.EEM, scale []float64, i int, mean, offset float64) (float64, bool) {
	ss := 0.0
	for n, b := range blanks {
		if !measured(b, i) {
			return 0, false
		}
		d := b.F[i] - offset - scale[n]*mean
		ss += d * d
	}
	return ss / float64(len(blanks)-1), !math.IsNaN(ss)
}

// NoiseFrom estimates the model from one EEM in counts: the second difference
// F(k−1) − 2F(k) + F(k+1) of neighbouring cells along emission, where a spectrum
// is nearly straight, has six times the variance of a cell. avoid says where it
// is not, as on the scatter lines; nil avoids nothing. The estimate is too low
// where the instrument smooths its scans; without replicates there is no better.
func NoiseFrom(e *eem.EEM, offset float64, avoid func(exNM, emNM float64) bool) (Noise, error) {
	if e.Unit != eem.Counts {
		return Noise{}, fmt.Errorf("an EEM in %s; the noise model needs raw counts", e.Unit)
	}
	var level, variance []float64
	for j := range e.Ex.Len() {
		for k := 1; k+1 < e.Em.Len(); k++ {
			i := e.Index(j, k)
			if !measured(e, i-1) || !measured(e, i) || !measured(e, i+1) || (avoid != nil && avoid(e.Ex.At(j), e.Em.At(k))) {
				continue
			}
			d := e.F[i-1] - 2*e.F[i] + e.F[i+1]
			level, variance = append(level, (e.F[i-1]+e.F[i]+e.F[i+1])/3-offset), append(variance, d*d/6)
		}
	}
	n, err := fitGroups(level, variance, 1, 3)
	n.Offset = offset
	return n, err
}

// fitGroups fits Read² and Shot to variances on dof degrees of freedom each; a
// level is the mean of n cells. The cells of a group differ in level, so that the
// median is taken of variance over model; model and medians are renewed in turn.
func fitGroups(level, variance []float64, dof float64, n int) (Noise, error) {
	if len(level) < perGroup {
		return Noise{}, fmt.Errorf("%d cells; the noise model needs %d", len(level), perGroup)
	}
	chi := distuv.ChiSquared{K: dof}.Quantile(0.5) / dof
	a, b := median(slices.Clone(variance))/chi, 0.0
	groups := group(level, 4*math.Sqrt(a/float64(n)))
	m, v, size := make([]float64, len(groups)), make([]float64, len(groups)), make([]float64, len(groups))
	for range 100 {
		for i, g := range groups {
			m[i], size[i] = g.level, float64(len(g.cells))
			ratio := make([]float64, len(g.cells))
			for j, c := range g.cells {
				at := g.level
				if !g.dark {
					at = level[c]
				}
				ratio[j] = variance[c] / max(a+b*at, tiny)
			}
			v[i] = median(ratio) / chi * max(a+b*m[i], tiny)
		}
		na, nb := twoTerms(m, v, size, a, b)
		done := math.Abs(na-a) <= 1e-6*na && math.Abs(nb-b) <= 1e-6*nb
		if a, b = na, nb; done {
			break
		}
	}
	if !(a+b > 2*tiny) || math.IsInf(a+b, 0) {
		return Noise{}, errors.New("the scans show no noise that a detector has; were they averaged or made up?")
	}
	return Noise{Read: math.Sqrt(a), Shot: b}, nil
}

// perGroup is the fewest cells of a group: the median of so many ratios is known
// to 1.25·√(2/ν)/√40, 28 % for ν = 1.
const perGroup = 40

// fewestBright is the fewest cells of the one group where there are no more: their
// median is known to 1.25·√(2/ν)/√10, 40 % for ν = 2.
const fewestBright = 10

// levelGroup is cells of like level.
type levelGroup struct {
	cells []int
	level float64
	dark  bool // the cells' levels are noise
}

// group sorts the cells by level. Cells below dark, where the level is its own
// noise, stay in their order (sorted, the highest of many dark cells would pass
// for dim light without shot noise), and those up to five times dark, where that
// noise still sorts, are left out when three groups of brighter ones remain.
func group(level []float64, dark float64) []levelGroup {
	order := make([]int, len(level))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(max(level[a], dark), max(level[b], dark)) })
	size := max(perGroup, len(level)/100)
	nDark, nDim := 0, 0
	for _, l := range level {
		if l < dark {
			nDark++
		}
		if l < 5*dark {
			nDim++
		}
	}
	if len(order)-nDim < 3*size {
		nDim = nDark
	}
	out := split(order[:nDark], level, size, true)
	if bright := len(order) - nDim; bright < size { // few tell little of shot noise, but that there is none would be wrong
		size = max(fewestBright, bright)
	}
	out = append(out, split(order[nDim:], level, size, false)...)
	if nDark > 0 { // one level for all, or they would tell of shot noise what they do not know
		ls := make([]float64, nDark)
		for i, c := range order[:nDark] {
			ls[i] = level[c]
		}
		all := max(0, median(ls))
		for i := range out {
			if out[i].dark {
				out[i].level = all
			}
		}
	}
	return out
}

// split makes groups of size.
func split(cells []int, level []float64, size int, dark bool) []levelGroup {
	var out []levelGroup
	for from := 0; from+size <= len(cells); from += size {
		g := levelGroup{cells: cells[from : from+size], dark: dark}
		ls := make([]float64, size)
		for i, c := range g.cells {
			ls[i] = level[c]
		}
		g.level = median(ls)
		out = append(out, g)
	}
	return out
}

// tiny keeps weights finite, counts²; a digitiser's step alone has variance 1/12.
const tiny = 1e-12

// twoTerms fits v = a + b·m, a, b ≥ 0, with weights size/(a₀ + b₀·m)², the inverse
// variances of variances.
func twoTerms(m, v, size []float64, a0, b0 float64) (a, b float64) {
	var s, sx, sxx, sy, sxy float64
	for i, y := range v {
		f := max(a0+b0*m[i], tiny)
		w, x := size[i]/(f*f), m[i]
		s, sx, sxx, sy, sxy = s+w, sx+w*x, sxx+w*x*x, sy+w*y, sxy+w*x*y
	}
	det := s*sxx - sx*sx
	if !(det > 1e-12*s*sxx) { // all at one level
		return sy / s, 0
	}
	a, b = (sxx*sy-sx*sxy)/det, (s*sxy-sx*sy)/det
	switch {
	case b < 0:
		return sy / s, 0
	case a < 0:
		return 0, sxy / sxx
	}
	return a, b
}

// median sorts v and returns its median.
func median(v []float64) float64 {
	slices.Sort(v)
	n := len(v)
	return (v[(n-1)/2] + v[n/2]) / 2
}

// WithNoise gives every cell of e, raw counts, the variance of the model. A model
// that rests on no blanks is told (noise-default).
func WithNoise(e *eem.EEM, n Noise) *eem.EEM {
	out := e.Clone()
	out.Var = make([]float64, len(out.F))
	for i, v := range out.F {
		out.Var[i] = n.Var(v) // NaN where the cell is missing
	}
	source := fmt.Sprintf("%d replicate blanks", n.Blanks)
	if n.Blanks == 0 {
		source = "second differences of the bottle's own scans"
	}
	out.Note(record(StepNoise, "variance of every cell from the noise model",
		eem.Param{Name: "read noise", Value: num(n.Read), Unit: "counts", Source: source},
		eem.Param{Name: "shot noise, variance per count", Value: num(n.Shot), Unit: "counts", Source: source}))
	if n.Blanks == 0 {
		f := finding(StepNoise, "noise-default", 0, 0, "the batch has fewer than three blanks; the noise was estimated from the roughness of the bottle's own scans: measure three blanks a day")
		f.Measure = false
		out.Note(f)
	}
	return out
}
