package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
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

// hasStandards says whether the sheet can build references.
func (j *job) hasStandards() bool {
	return slices.ContainsFunc(j.sv.Bottles, func(b *prepare.Bottle) bool { return j.calibrates(b) && len(b.Row.Conc) > 0 })
}

// calibrates says whether a bottle takes part in references.
func (j *job) calibrates(b *prepare.Bottle) bool {
	return b.Row.Kind == survey.Standard && !b.Excluded && b.Row.ExcludeFromFit == ""
}

// quantifyPart resolves against references, where there are any.
func (j *job) quantifyPart() error {
	how := j.set.Quantify.References
	if !j.quantify || how == "none" || (how == "auto" && !j.hasStandards()) {
		return nil
	}
	var set *unmix.Set
	var err error
	if how == "file" {
		set, err = readReferences(filepath.Join(j.dir, filepath.FromSlash(j.set.Quantify.File)), j.set.Quantify.File)
	} else {
		set, err = j.references()
	}
	if err != nil {
		return err
	}
	j.flags = append(j.flags, j.lineFlags()...)
	j.flags = append(j.flags, j.levelFlags(set)...)
	return j.resolveWith(set, "references", nil)
}

// references builds the set from the sheet's standards.
func (j *job) references() (*unmix.Set, error) {
	var names, units []string
	var standards []unmix.Standard
	for _, b := range j.sv.Bottles {
		if !j.calibrates(b) || !b.Usable() {
			continue
		}
		st := unmix.Standard{ID: b.Row.ID, Batch: b.Batch, Conc: map[string]float64{}}
		st.EEM = eem.FromCells(j.cube.Grid, j.cube.Unit, j.cube.Sample(j.row[b]))
		copy(st.EEM.Why, j.cube.SampleWhy(j.row[b]))
		for _, c := range b.Row.Conc {
			if !slices.Contains(names, c.Name) {
				names, units = append(names, c.Name), append(units, c.Unit)
			}
			st.Conc[c.Name] = c.Value * b.Undiluted() // of the bottle, like the corrected EEM
		}
		standards = append(standards, st)
	}
	set, lines, err := unmix.FromStandards(j.cube.Grid, j.cube.Unit, names, units, standards)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", j.sheet.Path, err)
	}
	j.lines = lines
	j.refs = &merit.References{Weights: unmix.WeightsOf(j.cube.Grid, names, standards)}
	for _, b := range j.sv.Bottles {
		if j.calibrates(b) && b.Usable() {
			j.refs.Row = append(j.refs.Row, j.row[b])
		}
	}
	for _, st := range standards {
		given := make([]float64, len(names))
		for f, name := range names {
			given[f] = st.Conc[name]
		}
		j.refs.Given = append(j.refs.Given, given)
	}
	return set, nil
}

// readReferences reads a reference file or a model file.
func readReferences(path, name string) (*unmix.Set, error) {
	if filepath.Ext(path) == ".json" {
		data, err := scanfile.Load(path)
		if err != nil {
			return nil, err
		}
		m, err := unmix.ParseModel(name, data)
		if err != nil {
			return nil, err
		}
		s := m.Set()
		s.Origin = name
		return s, nil
	}
	t, err := scanfile.ReadTable(path)
	if err != nil {
		return nil, err
	}
	rows := make([][]string, len(t.Rows))
	line := make([]int, len(t.Rows))
	for i, r := range t.Rows {
		rows[i], line[i] = r.Cells, r.Line
	}
	return unmix.ParseComponents(name, t.Header, rows, line)
}

// resolveWith resolves every usable bottle against a set and judges the result.
// more, if given, raises flags on single bottles from the resolution itself; they
// count in the judgement.
func (j *job) resolveWith(set *unmix.Set, method string, more func(*unmix.Resolution) []eem.Flag) error {
	set.Method = method
	if err := j.readLimits(set); err != nil {
		return err
	}
	r, err := unmix.Quantify(j.cube, set)
	if err != nil {
		return err
	}
	var extra []eem.Flag
	if more != nil {
		extra = more(r)
		j.flags = append(j.flags, extra...)
	}
	bottles := make([]merit.Bottle, 0, len(j.sv.Bottles))
	for _, b := range j.sv.Bottles {
		if b.Excluded {
			continue
		}
		bottles = append(bottles, j.merit(b))
	}
	j.reach(bottles, method, extra)
	src := j.sources(r)
	spreads := merit.Spreads(j.cube, r, src)
	yard := j.holdAgainst(r, spreads)
	judged := merit.Judge(r, spreads, bottles, j.cube.Sample, j.sv.Limit, j.sv.Accept, set.Origin)
	if err := j.unknowns(judged, r, bottles, src, set.Origin); err != nil {
		return err
	}
	j.res = append(j.res, r)
	j.judge = append(j.judge, judged)
	j.yards = append(j.yards, yard)
	j.src = append(j.src, src)
	j.qualify(len(j.res) - 1)
	return nil
}

// reach hands doubts on to the bottles that they concern: flags on one bottle,
// and those on the model or the references of a method, which every value used.
// A standard's doubt reaches the components that it stands for; cells that were
// left out of the reference for it do no harm.
func (j *job) reach(bottles []merit.Bottle, method string, extra []eem.Flag) {
	all := map[string][]string{} // component, empty for all of them
	for _, f := range j.flags {
		if f.ID == "" && f.Severity == eem.Doubt && f.Method == method {
			all[f.Component] = append(all[f.Component], f.Msg)
		}
	}
	for _, b := range j.sv.Bottles {
		if method != "references" || j.refs == nil || !j.calibrates(b) || !b.Usable() {
			continue
		}
		for _, c := range b.Row.Conc {
			for _, msg := range j.driftOf(b.Batch) {
				if c.Value > 0 && !slices.Contains(all[c.Name], msg) {
					all[c.Name] = append(all[c.Name], msg)
				}
			}
		}
		for _, f := range b.Flags {
			if f.Severity != eem.Doubt || f.Test == "saturated" || f.Test == "absorbance-limit" {
				continue
			}
			for _, c := range b.Row.Conc {
				if c.Value > 0 {
					all[c.Name] = append(all[c.Name], "standard "+b.Row.ID+": "+f.Msg)
				}
			}
		}
	}
	batch := j.batchDoubts()
	for i := range bottles {
		bottles[i].Doubts = append(bottles[i].Doubts, batch[bottles[i].Batch]...)
		for _, f := range extra {
			if f.ID == bottles[i].ID && f.Severity == eem.Doubt {
				bottles[i].Doubts = append(bottles[i].Doubts, f.Msg)
			}
		}
		bottles[i].Doubts = append(bottles[i].Doubts, all[""]...)
		bottles[i].Of = all
	}
}

// merit gathers what the judgement of a bottle needs.
func (j *job) merit(b *prepare.Bottle) merit.Bottle {
	m := merit.Bottle{ID: b.Row.ID, Batch: b.Batch, Row: -1, Unlike: b.Row.Kind == survey.Blank || b.Row.Kind == survey.FieldBlank,
		Standard: b.Row.Kind == survey.Standard}
	if i, ok := j.row[b]; ok {
		m.Row = i
	}
	for _, f := range b.Flags {
		switch f.Severity {
		case eem.Doubt:
			m.Doubts = append(m.Doubts, f.Msg)
		case eem.Reject:
			m.Rejects = append(m.Rejects, f.Msg)
		}
	}
	return m
}
