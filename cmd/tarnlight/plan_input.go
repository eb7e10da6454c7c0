package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

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

// wishes brings what the flags say of components, interferents and wavelengths.
func (in *planInput) wishes(o planOptions) error {
	p, names := &in.problem, in.problem.Set.Names()
	levels, err := amounts("--level", o.levels, names)
	if err != nil {
		return err
	}
	p.Want = make([]bool, len(names))
	if in.levels == "" {
		in.levels = "one of intensity at each maximum"
		if len(levels) < len(names) {
			in.note("nobody said what a typical bottle holds: each component is taken to reach an intensity of 1 at its maximum (--level NAME=AMOUNT)")
		}
	}
	for f, n := range names {
		if v, ok := levels[n]; ok {
			p.Level[f] = v
		}
		p.Want[f] = !slices.Contains(o.apart, n)
	}
	for _, n := range o.apart {
		if err := known("--apart", n, names); err != nil {
			return err
		}
	}
	if !slices.Contains(p.Want, true) {
		return misuse("--apart names all components; leave out those whose value is asked for")
	}
	if p.Unknown, err = unknownBands(o.unknown); err != nil {
		return err
	}
	p.WorstCase = o.worst
	if o.excitation != "" {
		from, to, _, err := span("--excitation", o.excitation, false)
		if err != nil {
			return err
		}
		nk := p.Set.Grid.Em.Len()
		in.leaveOut(func(i int, _ eem.Reason) bool {
			nm := p.Set.Grid.Ex.At(i / nk)
			return nm < from || nm > to
		}, nil)
	}
	return in.window(o.emission)
}

func unknownBands(given []string) ([]plan.Emission, error) {
	var out []plan.Emission
	for _, g := range given {
		at, width, has := strings.Cut(g, ":")
		e := plan.Emission{WidthNM: 80}
		var err1, err2 error
		e.AtNM, err1 = strconv.ParseFloat(at, 64)
		if has {
			e.WidthNM, err2 = strconv.ParseFloat(width, 64)
		}
		if errors.Join(err1, err2) != nil || !(e.AtNM > 0 && e.WidthNM > 0) {
			return nil, misuse("--unknown %q; write EMISSION or EMISSION:WIDTH in nm, such as 490:80", g)
		}
		out = append(out, e)
	}
	return out, nil
}

// window reads the emission range; a step is the nearest multiple of the grid's.
func (in *planInput) window(text string) error {
	if text == "" {
		return nil
	}
	from, to, step, err := span("--emission", text, true)
	if err != nil {
		return err
	}
	em := in.problem.Set.Grid.Em
	w := plan.Window{From: -1, Stride: 1}
	for k := range em.Len() {
		if nm := em.At(k); nm >= from && nm <= to {
			if w.From < 0 {
				w.From = k
			}
			w.To = k + 1
		}
	}
	if w.From < 0 || w.To-w.From < 2 {
		return misuse("--emission %s: the references know emissions of %s", text, em)
	}
	if step > 0 {
		of := (em.At(w.To-1) - em.At(w.From)) / float64(w.To-1-w.From)
		w.Stride = max(1, int(math.Round(step/of)))
		if got := float64(w.Stride) * of; math.Abs(got-step) > 0.01*step {
			in.note("--emission: a step of %g nm on points that are %.4g nm apart becomes %.4g nm", step, of, got)
		}
	}
	in.problem.Window = w
	return nil
}

// linesAt finds excitations of the grid.
func linesAt(ax eem.Axis, nm []float64, usable []int) ([]int, error) {
	var out []int
	for _, v := range nm {
		j, ok := ax.Find(v)
		if !ok || !slices.Contains(usable, j) {
			return nil, misuse("--with %g: no excitation of the references that can be used; the nearest is %g nm", v, ax.At(nearestOf(ax, usable, v)))
		}
		if !slices.Contains(out, j) {
			out = append(out, j)
		}
	}
	return out, nil
}

func nearestOf(ax eem.Axis, lines []int, nm float64) int {
	return slices.MinFunc(lines, func(a, b int) int {
		return cmp.Compare(math.Abs(ax.At(a)-nm), math.Abs(ax.At(b)-nm))
	})
}
