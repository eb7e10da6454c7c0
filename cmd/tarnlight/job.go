package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/parafac"
	"tarnlight/unmix/report"
)

// jobOptions are the flags of the verbs that work on a survey.
type jobOptions struct {
	dir        string
	out        string // empty: dir/out
	settings   string // empty: dir/survey.toml
	exclusions string // empty: those of the settings
	workers    int
	strict     bool
	json       bool
	pictures   bool
	fresh      bool // no cache
	sinceLast  bool // the outcome speaks of what the former results lack

	quantify, resolve bool // the parts of the work that the verb asks for
	verb              string
	model             string // file of a fixed model; empty: none
}

// flags adds the common flags to a verb.
func (o *jobOptions) flags(c *cobra.Command) {
	f := c.Flags()
	f.StringVar(&o.out, "out", "", "folder for the results (default SURVEY/out)")
	f.StringVar(&o.settings, "settings", "", "settings file (default SURVEY/survey.toml)")
	f.StringVar(&o.exclusions, "exclusions", "", "CSV of id, reason: bottles to leave out, such as the page saves (instead of [sheet] exclusions)")
	f.IntVar(&o.workers, "workers", 0, "how many bottles at a time (default: all cores; results do not depend on it)")
	f.BoolVar(&o.strict, "strict", false, "exit 1 when a bottle was rejected")
	f.BoolVar(&o.json, "json", false, "print JSON lines (cmd/tarnlight/events.schema.json) instead of a table; the last one is the outcome")
	f.BoolVar(&o.fresh, "fresh", false, "read and correct every bottle again and keep none (default: unchanged ones are taken over from OUT.cache)")
	f.BoolVar(&o.pictures, "pictures", true, "make report.xlsx, report.html and the pictures")
}

// job is one survey on its way from raw files to a results folder.
type job struct {
	jobOptions
	streams streams
	bar     *bar

	set    *survey.Settings
	sheet  *survey.Sheet
	sv     *prepare.Survey
	cache  *prepare.Cache          // nil without one
	cube   *eem.Cube               // usable bottles on the survey's grid
	row    map[*prepare.Bottle]int // bottle → row of the cube
	res    []*unmix.Resolution     // one a method
	judge  []*merit.Judged         // beside res
	yards  []*unmix.Yardstick      // beside res: what residuals are held against, all setups together
	src    []*merit.Sources        // beside res: the errors behind them
	lines  []unmix.Line            // of the references
	refs   *merit.References       // how they came from standards; nil when they did not
	limits map[string]merit.Limits // the laboratory's own, by component
	fit    *parafac.Result         // nil without resolve
	fits   []*parafac.Result       // candidates
	choice *parafac.Choice         // nil where the number was stated
	flags  []eem.Flag              // all of them, in order
	optics map[*prepare.Bottle][]optics.Index

	old         map[string]bool // ids of which the outcome does not speak; nil: it speaks of all
	applied     *unmix.Model    // the fixed model of apply, nil otherwise
	appliedName string
}

// execute does the whole job. The results folder is replaced at the very end or
// not at all.
func (o jobOptions) execute(ctx context.Context, s streams) (*job, error) {
	j := &job{jobOptions: o, streams: s, bar: newBar(s.err)}
	if j.out == "" {
		j.out = filepath.Join(j.dir, "out")
	}
	if err := j.readModel(); err != nil {
		return nil, err
	}
	if err := j.readInputs(); err != nil {
		return nil, err
	}
	stage, err := outdir.Begin(j.out)
	if err != nil {
		return nil, err
	}
	j.openCache()
	if err := j.work(ctx, stage); err != nil {
		j.yieldCache(err)
		if abort := stage.Abort(); abort != nil {
			fmt.Fprintf(j.bar, "the unfinished results could not be removed: %v\n", abort)
		}
		return nil, err
	}
	return j, nil
}

// readInputs reads settings and run sheet.
func (j *job) readInputs() error {
	err := surveyFolder(j.dir)
	if err != nil {
		return err
	}
	if j.settings != "" {
		if _, err := os.Stat(j.settings); err != nil {
			return fmt.Errorf("--settings %s: no such file; leave the flag out for SURVEY/survey.toml", j.settings)
		}
	}
	if j.set, err = survey.ReadSettings(j.settingsPath()); err != nil {
		return err
	}
	if j.exclusions != "" {
		if _, err := os.Stat(j.exclusions); err != nil {
			return fmt.Errorf("--exclusions %s: no such file; it is a CSV with the columns id and reason", j.exclusions)
		}
		if j.set.Sheet.Exclusions, err = fromSurvey(j.dir, j.exclusions); err != nil {
			return err
		}
	}
	if j.applied != nil {
		if err := j.freeze(); err != nil {
			return err
		}
	}
	if j.sheet, err = survey.ReadSheet(j.dir, j.set); err != nil {
		return err
	}
	return j.checkYieldStandard()
}

// fromSurvey gives a path of the command line as the settings want it: relative
// to the survey folder, so that results name no folder of this machine.
func fromSurvey(dir, path string) (string, error) {
	base, err := filepath.Abs(dir)
	if err != nil {
		return "", err
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return "", err
	}
	rel, err := filepath.Rel(base, abs)
	return filepath.ToSlash(rel), err
}

// work does everything between the raw files and the finished folder.
func (j *job) work(ctx context.Context, stage *outdir.Staging) error {
	if err := j.prepare(ctx); err != nil {
		return err
	}
	if err := j.unmix(ctx); err != nil {
		if ctx.Err() == nil { // what is wrong with the bottles may be why
			err = errors.Join(printFindings(j.bar, j.sv.Flags), err)
		}
		return err
	}
	j.collectFlags()
	j.findOld()
	if err := j.write(stage); err != nil {
		return err
	}
	if j.pictures {
		if err := report.Render(ctx, stageDir(stage), j.renderSettings(), j.bar.step); err != nil {
			return err
		}
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	if edited := stage.Edited(); len(edited) > 0 {
		fmt.Fprintf(j.bar, "changed by hand since the last run, kept in %s.previous until the next one: %s\n", j.out, some(edited))
	}
	return stage.Commit(j.provenance())
}

// prepare reads and corrects the bottles and stacks the usable ones.
func (j *job) prepare(ctx context.Context) error {
	var err error
	opt := prepare.Options{Workers: j.workers, Progress: j.bar.step, Cache: j.cache}
	if j.applied != nil {
		opt.Grid, opt.KeepUnit, opt.Known = &j.applied.Grid, true, instrumentOf(j.applied.Instrument)
	}
	j.sv, err = prepare.Read(ctx, j.dir, j.sheet, j.set, opt)
	if err != nil {
		return err
	}
	j.tellCache()
	for _, g := range j.sv.Guesses {
		fmt.Fprintf(j.bar, "%s: %s (first: %s)\n", eem.Count(g.Files, "file"), g.Text, g.First)
	}
	usable := j.sv.Pick((*prepare.Bottle).Usable)
	j.cube = j.sv.Cube(usable)
	j.row = map[*prepare.Bottle]int{}
	for i, b := range usable {
		j.row[b] = i
		if b.EEM.Grid.Equal(j.cube.Grid) { // one copy is enough
			b.EEM.F, b.EEM.Why = j.cube.Sample(i), j.cube.SampleWhy(i)
		}
	}
	return nil
}

// unmix resolves the bottles by every method that is asked for.
func (j *job) unmix(ctx context.Context) error {
	if err := j.methods(ctx); err != nil {
		return err
	}
	return j.checkAlerts()
}

func (j *job) methods(ctx context.Context) error {
	if j.applied != nil {
		return j.applyPart()
	}
	if err := j.quantifyPart(); err != nil {
		return err
	}
	if err := j.resolvePart(ctx); err != nil {
		return err
	}
	if len(j.res) == 0 {
		return fmt.Errorf("nothing to do: the sheet has no standards with conc: columns, no reference file is named ([quantify] references), and [resolve] components is \"off\"; add one of them")
	}
	return nil
}
