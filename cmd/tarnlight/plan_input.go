package main

import (
	"context"
	"fmt"
	"math"
	"path/filepath"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/plan"
)

// planInput is a design problem on its way, and what must be said about it.
type planInput struct {
	problem plan.Problem
	setting *survey.Settings // scatter bands, inner filter, intensity scale
	noise   string           // where the noise is from, in words
	assumed bool             // nobody stated it
	levels  string           // where the levels are from, in words
	notes   []string
	seen    *eem.Absorbance // of a typical bottle, nil unknown
	samples *planSamples    // nil unknown
	departs bool            // the samples are known to depart from the model
}

func (in *planInput) note(format string, a ...any) {
	in.notes = append(in.notes, fmt.Sprintf(format, a...))
}

// input reads what REFERENCES is.
func (o planOptions) input(ctx context.Context, s streams) (*planInput, error) {
	in := &planInput{}
	var err error
	if isFolder(o.from) {
		err = o.fromSurvey(ctx, s, in)
	} else {
		err = o.fromFile(ctx, s, in)
	}
	if err != nil {
		return nil, err
	}
	return in, o.innerFilter(in)
}

// readSurvey reads and corrects a survey, without resolving it.
func (o planOptions) readSurvey(ctx context.Context, s streams, dir string) (*job, error) {
	j := &job{jobOptions: jobOptions{dir: dir, quantify: true}, streams: s, bar: newBar(s.err)}
	if dir == o.from {
		j.settings = o.settings
	}
	if err := j.readInputs(); err != nil {
		return nil, err
	}
	return j, j.prepare(ctx)
}

// fromSurvey makes references of a survey's standards.
func (o planOptions) fromSurvey(ctx context.Context, s streams, in *planInput) error {
	j, err := o.readSurvey(ctx, s, o.from)
	if err != nil {
		return err
	}
	var set *unmix.Set
	switch {
	case j.set.Quantify.References == "file":
		set, err = readReferences(filepath.Join(j.dir, filepath.FromSlash(j.set.Quantify.File)), j.set.Quantify.File)
		if err == nil {
			set = set.OnGrid(j.sv.Grid)
		}
	case j.hasStandards():
		set, err = j.references()
	default:
		return fmt.Errorf("%s has no standards with conc: columns; plan with the model of its samples, %s, or a reference file", j.sheet.Path, filepath.Join(o.from, "out", "model.json"))
	}
	if err != nil {
		return err
	}
	in.problem.Set, in.setting = set, j.sv.Settings
	in.mask(prepare.Bands(in.setting.Scatter))
	if err := in.ownSamples(j); err != nil {
		return err
	}
	return o.noise(ctx, s, in, j)
}

// fromFile reads a reference or model file. A model brings its cells, its settings and
// the bottles that it was made of.
func (o planOptions) fromFile(ctx context.Context, s streams, in *planInput) error {
	set, err := readReferences(o.from, o.from)
	if err != nil {
		return err
	}
	in.problem.Set, in.setting = set, survey.Default()
	var like *unmix.Likeness
	if filepath.Ext(o.from) == ".json" {
		if like, err = in.fromModel(o.from); err != nil {
			return err
		}
	}
	if o.settings != "" {
		if in.setting, err = survey.ReadSettings(o.settings); err != nil {
			return err
		}
	}
	in.fileLevels(like)
	if o.settings != "" || filepath.Ext(o.from) != ".json" {
		in.mask(prepare.Bands(in.setting.Scatter))
	}
	return o.noise(ctx, s, in, nil)
}

// fromModel takes what else a model file holds.
func (in *planInput) fromModel(path string) (*unmix.Likeness, error) {
	data, err := scanfile.Load(path)
	if err != nil {
		return nil, err
	}
	m, err := unmix.ParseModel(path, data)
	if err != nil {
		return nil, err
	}
	in.setting, err = survey.ParseSettings(path+", settings", []byte(m.Settings))
	return m.Likeness, err
}

// mask takes the cells of scatter bands out of the set.
func (in *planInput) mask(bands []scatter.Band) {
	set := in.problem.Set
	e := eem.FromCells(set.Grid, set.Unit, make([]float64, set.Grid.Cells()))
	in.leaveOut(func(i int, why eem.Reason) bool { return why != eem.Measured }, scatter.Mask(e, bands).Why)
}

// leaveOut takes cells out of the set.
func (in *planInput) leaveOut(out func(i int, why eem.Reason) bool, why []eem.Reason) {
	set := *in.problem.Set
	mask := make([]bool, set.Grid.Cells())
	for i := range mask {
		w := eem.Measured
		if why != nil {
			w = why[i]
		}
		mask[i] = (set.Mask == nil || set.Mask[i]) && !out(i, w)
	}
	set.Mask = mask
	in.problem.Set = &set
}

// fileLevels takes the bottles that a model was made of, else one of intensity at the
// maximum of each component.
func (in *planInput) fileLevels(like *unmix.Likeness) {
	set := in.problem.Set
	in.problem.Level = make([]float64, set.Len())
	if like != nil {
		for f, v := range like.Mean {
			in.problem.Level[f] = math.Exp(v)
		}
		in.levels = fmt.Sprintf("geometric mean of the model's %d bottles", like.N)
		return
	}
	for f := range in.problem.Level {
		in.problem.Level[f] = oneOfIntensity(set, f)
	}
}

// oneOfIntensity is the amount of component f whose maximum has the intensity 1.
func oneOfIntensity(set *unmix.Set, f int) float64 {
	top := 0.0
	for j := range set.Grid.Ex.Len() {
		for k := range set.Grid.Em.Len() {
			if v := set.Components[f].At(set.Grid, j, k); v > top {
				top = v
			}
		}
	}
	return 1 / top
}
