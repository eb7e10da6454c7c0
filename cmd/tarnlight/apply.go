package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
)

// newApplyCmd scores new bottles on a fixed model.
func newApplyCmd(s streams) *cobra.Command {
	o := jobOptions{verb: "apply"}
	c := &cobra.Command{
		Use:   "apply MODEL SURVEY",
		Short: "Scores new samples on a fixed model",
		Long: `apply corrects the bottles of a survey like those of the model (its grid, bands and
unit hold, whatever the survey's own settings say), scores each of them by
non-negative least squares on the model's spectra, and flags bottles unlike those
that the model was made of. A bottle gets the same numbers alone and among others.
A batch that cannot be given in the model's unit, such as a night without a blank,
has its bottles rejected; [correct] blank = "latest" takes the last blank that is
not older than blank_max_age_days. Where not one bottle can be used the results say
so of each, exit code 3, and the former ones are whole in out.previous.

In a folder that grows from night to night --since-last lets exit code and
status.json speak of the bottles that the former results lack. concerns in
status.json says which of them concern the instrument, are unlike the model, are over
a limit ([quality] alert and others), or have something wrong with their data.`,
		Example: "  tarnlight apply lastyear/out/model.json tonight\n  tarnlight apply lastyear/out/model.json nights --since-last --pictures=false",
		Args:    cobra.ExactArgs(2),
	}
	o.flags(c)
	c.Flags().BoolVar(&o.sinceLast, "since-last", false, "exit code and status.json speak of bottles that the former results lack")
	c.RunE = func(c *cobra.Command, args []string) error {
		o.model, o.dir = args[0], args[1]
		return runJob(c.Context(), s, o)
	}
	return c
}

// readModel reads the fixed model, where the verb has one.
func (j *job) readModel() error {
	if j.model == "" {
		return nil
	}
	data, err := scanfile.Load(j.model)
	if err != nil {
		return err
	}
	j.appliedName = filepath.Base(j.model)
	j.applied, err = unmix.ParseModel(j.model, data)
	return err
}

// freeze puts the model's bands and intensity scale in the place of the survey's.
func (j *job) freeze() error {
	m, err := survey.ParseSettings(j.model+", settings", []byte(j.applied.Settings))
	if err != nil {
		return err
	}
	j.set.Scatter = m.Scatter
	j.set.Intensity = m.Intensity
	return nil
}

// instrumentOf is what a model tells of the instrument, nil where it tells nothing.
func instrumentOf(in *unmix.Instrument) *prepare.Known {
	if in == nil {
		return nil
	}
	k := &prepare.Known{Repeat: prepare.Repeat{U: nan}}
	if in.Blanks > 0 {
		k.Noise = &correct.Noise{Read: in.ReadNoise, Shot: in.ShotNoise, Blanks: in.Blanks}
	}
	if in.RepeatDF > 0 {
		k.Repeat = prepare.Repeat{U: in.Repeat, DF: in.RepeatDF, Source: fmt.Sprintf("the model's survey, %g degrees of freedom", in.RepeatDF)}
	}
	return k
}

// ownInstrument puts what the survey tells of its instrument into a model.
func (j *job) ownInstrument() *unmix.Instrument {
	k := j.sv.KnownOf("")
	in := &unmix.Instrument{}
	if k.Noise != nil {
		in.ReadNoise, in.ShotNoise, in.Blanks = k.Noise.Read, k.Noise.Shot, k.Noise.Blanks
	}
	if k.Repeat.DF > 0 && !math.IsNaN(k.Repeat.U) {
		in.Repeat, in.RepeatDF = k.Repeat.U, k.Repeat.DF
	}
	if *in == (unmix.Instrument{}) {
		return nil
	}
	return in
}

// applyPart scores the bottles on the fixed model.
func (j *job) applyPart() error {
	if err := j.accepts(); err != nil {
		return err
	}
	set := j.applied.Set()
	set.Origin = j.appliedName
	if set.Errors == nil {
		j.flags = append(j.flags, j.sv.Accept(eem.NewFlag(eem.Flag{Method: "model", Test: "model-parts", Severity: eem.Remark, Value: nan, Limit: nan,
			Msg: j.appliedName + " does not say how sure its spectra are, so that the uncertainties lack them; make the model again with this version"})))
	}
	return j.resolveWith(set, "model", j.likeness)
}

// covered is the share of a component's energy that the survey must cover (common
// practice, no source).
const covered = 0.5

// accepts refuses a survey whose unit, corrections or wavelengths are not those of
// the model.
func (j *job) accepts() error {
	var grids []eem.Grid
	for _, b := range j.sv.Bottles {
		if b.Usable() && b.Row.Kind != survey.Blank {
			grids = append(grids, b.EEM.Grid)
		}
	}
	if len(grids) == 0 && (len(j.row) == 0 || j.applied.Unit == j.sv.Unit) { // that no bottle can be scored is a result too
		j.cube.Unit = j.applied.Unit
		return nil
	}
	if j.applied.Unit != j.sv.Unit {
		return fmt.Errorf("%s is in %s and the survey in %s; give the survey what that unit needs (for Raman units a blank in every batch), or make a model in %s",
			j.model, j.applied.Unit, j.sv.Unit, j.sv.Unit)
	}
	if have, want := j.corrections(), j.applied.Corrections; !slices.Equal(have, want) {
		return fmt.Errorf("%s was made of intensities corrected for: %s; this survey's are corrected for: %s; correct both alike ([correct], [scans] applied)",
			j.model, list(want), list(have))
	}
	set := j.applied.Set()
	best := make([]float64, set.Len())
	for _, g := range grids {
		for f, share := range set.Covered(g) {
			best[f] = max(best[f], share)
		}
	}
	var lacking []string
	for f, c := range set.Components {
		if best[f] < covered {
			ex, em := strong(set.Grid.Ex, c.Ex), strong(set.Grid.Em, c.Em)
			lacking = append(lacking, fmt.Sprintf("%s (%.0f %% of it; it needs ex %s, em %s nm)", c.Name, 100*best[f], ex, em))
		}
	}
	if lacking != nil {
		return fmt.Errorf("%s: the survey's scans cover too little of %s; measure those wavelengths", j.model, strings.Join(lacking, ", "))
	}
	return nil
}

func list(s []string) string {
	if len(s) == 0 {
		return "nothing"
	}
	return strings.Join(s, ", ")
}

// strong gives the range in which a spectrum is above half its maximum.
func strong(a eem.Axis, v []float64) string {
	lo, hi := -1, 0
	for i, x := range v {
		if x >= 0.5 {
			if lo < 0 {
				lo = i
			}
			hi = i
		}
	}
	if lo < 0 {
		return a.String()
	}
	return fmt.Sprintf("%g–%g", a.At(lo), a.At(hi))
}

// likeness flags bottles unlike those of the model.
func (j *job) likeness(r *unmix.Resolution) (out []eem.Flag) {
	l := j.applied.Likeness
	if l == nil {
		return nil
	}
	n := r.Set.Len()
	for _, b := range j.sv.Bottles {
		i, ok := j.row[b]
		if k := b.Row.Kind; !ok || !r.Fits[i].Usable || (k != survey.Sample && k != survey.Spike) {
			continue
		}
		add := func(code string, v, limit float64, msg string) {
			out = append(out, j.sv.Accept(eem.Flag{ID: b.Row.ID, Batch: b.Batch, Method: "model", Test: code, Severity: eem.Doubt, Value: v, Limit: limit, Msg: msg}))
		}
		if left := 1 - r.Fits[i].Explained/100; left > l.Residual {
			add("unlike-residual", left, l.Residual, fmt.Sprintf("the model leaves %.2g %% of the signal over, of its own bottles %.2g %% at most (1 in 100 exceeds it by chance); most at ex %s / em %s nm",
				100*left, 100*l.Residual, eem.NM(r.Fits[i].HotEx), eem.NM(r.Fits[i].HotEm)))
		}
		if d := l.Distance(r.Value[i*n : (i+1)*n]); d > l.T2 {
			add("unlike-scores", d, l.T2, "the mixture of components is unlike that of the model's own bottles (1 in 100 exceeds the limit by chance)")
		}
	}
	return out
}
