package main

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/unmix/plan"
)

// usualBlanks is how many blanks are taken to be averaged where nobody says it.
const usualBlanks = 3

// noise fills in the noise: stated, of a survey, or assumed. own is the survey that
// the references come from, nil without one.
func (o planOptions) noise(ctx context.Context, s streams, in *planInput, own *job) error {
	from := own
	if o.like != "" {
		like, err := o.readSurvey(ctx, s, o.like)
		if err != nil {
			return err
		}
		if err := in.like(o.like, like); err != nil {
			return err
		}
		from = like
	}
	if from != nil && in.seen == nil {
		in.seen = medianAbsorbance(from)
	}
	n := &in.problem.Noise
	switch {
	case o.read+o.shot > 0:
		*n = plan.Even(in.problem.Set.Grid.Cells(), o.read, o.shot, usualBlanks)
		in.noise = "stated"
	case from != nil && from.sv.Noise != nil:
		in.bareNoise(from)
	case from != nil && in.samples != nil:
		in.scatter(from)
	default:
		in.assume(usualBlanks)
	}
	if o.blanks >= 0 {
		n.Blanks = o.blanks
	}
	return nil
}

// like takes bands, levels and departures of a survey measured on the same instrument.
func (in *planInput) like(name string, j *job) error {
	set := in.problem.Set
	if set.Unit != "" && set.Unit != j.sv.Unit {
		return fmt.Errorf("--like %s is in %s, the references are in %s; give a survey in that unit, or --read and --shot", name, j.sv.Unit, set.Unit)
	}
	in.setting = j.sv.Settings
	in.mask(prepare.Bands(in.setting.Scatter))
	p, err := samplesOn(j, in.problem.Set, "model")
	if err != nil {
		return fmt.Errorf("--like %s: %w", name, err)
	}
	if in.samples = p; p == nil || in.levels != "" {
		return nil
	}
	in.levels = fmt.Sprintf("median of %d samples", len(p.rows))
	for f, v := range p.levels() {
		if v > 0 {
			in.problem.Level[f] = v
		}
	}
	return nil
}

// bareNoise takes the noise that the survey knows, and what its samples depart from
// the model beyond it.
func (in *planInput) bareNoise(j *job) {
	b, g := j.sv.Noise, in.problem.Set.Grid
	in.problem.Noise = plan.Noise{Read2: toGrid(j, b.Read2, g), Shot: toGrid(j, b.Shot, g), Blanks: b.Blanks}
	in.noise = fmt.Sprintf("blanks of the survey (cells of %s)", b.ID)
	if b.Water != nil {
		in.problem.Noise.Water = toGrid(j, b.Water, g)
	} else {
		in.noise = fmt.Sprintf("roughness of the scans of %s, because the survey lacks three blanks", b.ID)
	}
	if in.samples == nil {
		return
	}
	if n := &in.problem.Noise; in.samples.misfit(j.cube, n) {
		n.Misfit = toGrid(j, n.Misfit, g)
		in.noise += ", and what the samples depart from the model beyond it"
		in.departs = true
	}
}

// scatter takes for noise what the components leave of the samples.
func (in *planInput) scatter(j *job) {
	square, _ := in.samples.departures(j.cube)
	g := in.problem.Set.Grid
	in.problem.Noise = plan.Noise{Read2: toGrid(j, square, g), Shot: make([]float64, g.Cells())}
	in.departs = true
	in.noise = fmt.Sprintf("not known; what the components leave of %d samples stands for it", len(in.samples.rows))
}

// toGrid brings a map on the survey's grid to another; what it does not cover is NaN.
func toGrid(j *job, v []float64, g eem.Grid) []float64 {
	return eem.FromCells(j.sv.Grid, j.sv.Unit, v).Regrid(g).F
}

// Noise where nobody stated any, relative to the brightest cell of a typical bottle:
// of the order that a good instrument has (common practice, no source).
const (
	assumedRead = 0.002
	assumedShot = 0.005
)

func (in *planInput) assume(blanks int) {
	set := in.problem.Set
	a, cells := set.Matrix()
	top, n := 0.0, set.Len()
	for l := range cells {
		v := 0.0
		for f := range n {
			v += in.problem.Level[f] * a[l*n+f]
		}
		top = math.Max(top, v)
	}
	in.problem.Noise = plan.Even(set.Grid.Cells(), assumedRead*top, assumedShot*assumedShot*top, blanks)
	in.assumed, in.noise = true, "assumed"
	in.note("the noise is not known and was assumed: %.3g without light and %.3g at the brightest cell (%.3g) of a typical bottle; uncertainties and detection limits depend on it, and the choice of lines may: give --like SURVEY, or --read and --shot",
		assumedRead*top, math.Hypot(assumedRead, assumedShot)*top, top)
}

// medianAbsorbance is that of the sample whose absorbance at the shortest excitation
// is in the middle; nil where no sample has one.
func medianAbsorbance(j *job) *eem.Absorbance {
	type one struct {
		v float64
		a *eem.Absorbance
	}
	var list []one
	for _, b := range j.sv.Bottles {
		if b.Usable() && b.Row.Kind == survey.Sample && b.Absorb != nil {
			if v := b.Absorb.PerCM(max(j.sv.Grid.Ex.First(), b.Absorb.Axis.First())); v == v {
				list = append(list, one{v, b.Absorb})
			}
		}
	}
	if len(list) == 0 {
		return nil
	}
	slices.SortStableFunc(list, func(x, y one) int { return cmp.Compare(x.v, y.v) })
	return list[len(list)/2].a
}

// innerFilter fills in the factors of a typical bottle.
func (o planOptions) innerFilter(in *planInput) error {
	if o.absorbance != "" {
		a, _, err := scanfile.ReadAbsorbance(o.absorbance, nil)
		if err != nil {
			return err
		}
		a.PathCM = o.pathCM
		in.seen = a
	}
	g, on := prepare.Geometry(in.setting.Correct)
	if in.seen == nil || !on {
		if on {
			in.note("no absorbance of a typical bottle is known: the inner filter is left out of the prediction (--absorbance FILE)")
		}
		return nil
	}
	grid := in.problem.Set.Grid
	a := in.seen.Times(o.times)
	at := func(ax eem.Axis) []float64 {
		v := make([]float64, ax.Len())
		for i := range v {
			v[i] = a.PerCM(ax.At(i))
		}
		return v
	}
	in.problem.Factor = g.Factors(at(grid.Ex), at(grid.Em))
	lost := 0
	for i, f := range in.problem.Factor {
		if f != f && grid.Em.At(i%grid.Em.Len()) >= grid.Ex.At(i/grid.Em.Len()) {
			lost++
		}
	}
	if lost > 0 {
		in.note("%s left out: outside the absorbance spectrum (%s)", eem.Count(lost, "cell"), a.Axis)
	}
	return nil
}
