package main

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/plan"
)

// planSamples are the samples of a survey resolved against the components that scans
// are planned for: what a typical bottle holds, and how far bottles depart from them.
type planSamples struct {
	rows    []int // of the cube
	r       *unmix.Resolution
	spreads []merit.Spread
}

// samplesOn resolves the samples of a survey; nil where it has none.
func samplesOn(j *job, set *unmix.Set, method string) (*planSamples, error) {
	p := &planSamples{}
	for _, b := range j.sv.Bottles {
		if i, ok := j.row[b]; ok && b.Row.Kind == survey.Sample {
			p.rows = append(p.rows, i)
		}
	}
	if len(p.rows) == 0 {
		return nil, nil
	}
	on := *set
	on.Method = method
	var err error
	if p.r, err = unmix.Quantify(j.cube, &on); err != nil {
		return nil, err
	}
	p.spreads = merit.Spreads(j.cube, p.r, j.sources(p.r))
	return p, nil
}

// levels are medians over the samples that hold a component, 0 where none does.
func (p *planSamples) levels() []float64 {
	n := p.r.Set.Len()
	out := make([]float64, n)
	for f := range out {
		var v []float64
		for _, i := range p.rows {
			if x := p.r.Value[i*n+f]; x > 0 {
				v = append(v, x)
			}
		}
		if slices.Sort(v); len(v) > 0 {
			out[f] = median(v)
		}
	}
	return out
}

// fewSamples is how many samples are too few for a median.
const fewSamples = 5

// departures gives the typical squared residual of each cell, and its typical noise
// variance, both over the samples: medians, divided by the median of χ² on one degree
// of freedom, so that one odd bottle does not count; means where there are few.
func (p *planSamples) departures(c *eem.Cube) (square, noise []float64) {
	cells := c.Cells()
	square, noise = make([]float64, cells), make([]float64, cells)
	maps := make([][]float64, len(p.rows))
	for m, i := range p.rows {
		maps[m] = make([]float64, cells)
		p.r.ResidualTo(maps[m], c.Sample(i), i)
	}
	_, known := p.r.Set.Matrix()
	for l := range square {
		square[l], noise[l] = nan, nan
	}
	for _, l := range known {
		var v, u []float64
		for m, i := range p.rows {
			if x := maps[m][l]; x == x && c.SampleWhy(i)[l] == eem.Measured {
				v = append(v, x*x)
				if s := c.SampleU(i); s != nil {
					u = append(u, float64(s[l])*float64(s[l]))
				}
			}
		}
		square[l], noise[l] = typical(v, 0.4549364231195724), typical(u, 1)
	}
	return square, noise
}

func typical(v []float64, medianOfChi float64) float64 {
	if len(v) == 0 {
		return nan
	}
	if len(v) < fewSamples {
		sum := 0.0
		for _, x := range v {
			sum += x / float64(len(v))
		}
		return sum
	}
	slices.Sort(v)
	return median(v) / medianOfChi
}

// misfit fills in the variance beyond noise, cell by cell, and how far it is alike;
// nothing where the middle sample shows none. How large it is comes from the budgets,
// how it lies on the map from the residuals.
func (p *planSamples) misfit(c *eem.Cube, n *plan.Noise) bool {
	var size, ex, em []float64
	for _, i := range p.rows {
		size, ex, em = append(size, p.spreads[i].Misfit), append(ex, p.spreads[i].Alike[0]), append(em, p.spreads[i].Alike[1])
	}
	for _, v := range [][]float64{size, ex, em} {
		slices.Sort(v)
	}
	if !(median(size) > 0) {
		return false
	}
	square, noise := p.departures(c)
	sum, cells := 0.0, 0.0
	for i := range square {
		square[i] = math.Max(0, square[i]-noise[i])
		if square[i] == square[i] {
			sum, cells = sum+square[i], cells+1
		}
	}
	if !(sum > 0) {
		return false
	}
	for i := range square {
		square[i] *= median(size) * cells / sum
	}
	n.Misfit, n.AlikeNM = square, [2]float64{alikeNM(c.Ex, median(ex)), alikeNM(c.Em, median(em))}
	return true
}

// alikeNM is the distance over which a correlation of neighbours on an axis falls to
// 1/e.
func alikeNM(a eem.Axis, rho float64) float64 {
	if !(rho > 0) || a.Len() < 2 {
		return 0
	}
	return (a.Last() - a.First()) / float64(a.Len()-1) / -math.Log(rho)
}

// ownSamples takes levels and misfit of the survey that the references come from.
func (in *planInput) ownSamples(j *job) error {
	p, err := samplesOn(j, in.problem.Set, "references")
	if err != nil {
		return err
	}
	set := in.problem.Set
	in.problem.Level = make([]float64, set.Len())
	in.levels = "the standards"
	if p != nil {
		in.problem.Level = p.levels()
		in.levels = fmt.Sprintf("median of %d samples", len(p.rows))
		in.samples = p
	}
	for f, c := range set.Components {
		switch {
		case in.problem.Level[f] > 0:
		case c.Highest > 0:
			in.problem.Level[f] = c.Highest / 4
			in.note("no sample holds %s; its typical level is taken as a quarter of the highest standard (--level)", c.Name)
		default:
			in.problem.Level[f] = oneOfIntensity(set, f)
			in.note("no sample holds %s; its typical level is taken as one of intensity at its maximum (--level)", c.Name)
		}
	}
	return nil
}
