package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"tarnlight/unmix/plan"
	"tarnlight/unmix/report"
)

type planOptions struct {
	from     string // reference file, model file, survey folder, or absorbance file of one substance
	settings string
	like     string // survey measured on the same instrument
	scans    int
	with     []float64 // nm, part of every plan
	apart    []string  // names
	unknown  []string  // EM or EM:WIDTH, nm
	levels   []string  // NAME=VALUE
	limits   []string  // NAME=VALUE
	worst    bool

	read, shot float64 // 0: not given
	blanks     int     // below 0: not given
	absorbance string
	pathCM     float64
	times      float64

	excitation, emission string // FROM:TO and FROM:TO[:STEP]
	narrow               float64
	time                 plan.Timing
	seed                 uint64
	draw                 int
	out, figures         string
	json                 bool
}

// newPlanCmd chooses the scans of a survey to come.
func newPlanCmd(s streams) *cobra.Command {
	var o planOptions
	c := &cobra.Command{
		Use:   "plan REFERENCES",
		Short: "Which few scans would do, and what they cost in certainty",
		Long: `plan chooses, for 1, 2, 3 … scans, the excitations with which the components of
REFERENCES are known best, and predicts what run would then report: standard
uncertainty at a typical level, detection limit and variance inflation of every
component, beside those of all scans of the grid. REFERENCES is

  a survey folder       its standards; noise, scatter bands, typical levels and
                        absorbance are those of its blanks and samples
  a model file          model.json of an earlier run
  a reference file      spectra in the layout of components.csv
  an absorbance file    of one substance: its excitation maximum, with a warning where
                        that lies in a scatter band or beyond the linear range

Without a survey state the noise (--read and --shot, or --like a survey measured on
the same instrument); else it is assumed, and plan exits with 3.

What is predicted is the noise of the bottle and of the blanks, and what the samples
of the survey depart from the model beyond noise, as both come out of the fit that run
does. Every cell weighs the same in it: a dim, noisy scan can do harm, so that fewer
scans can have a smaller predicted uncertainty than all. They also show less of what
the model does not know: run will see less of it and report less of it. Where samples
are known to depart from the model, no plan of fewer scans than components + 1 is
suggested; keep the full grid for some bottles in any case. Errors that cells share
(intensity scale, stock solutions) are the same for any plan and not in it, nor is that
a contribution is never negative: the figures hold well above the detection limit.`,
		Example: "  tarnlight plan mysurvey\n" +
			"  tarnlight plan mysurvey --scans 5 --limit tryptophan=1 --figures plan -o plan.csv\n" +
			"  tarnlight plan mysurvey/out/model.json --like mysurvey --with 350 --narrow 10 --unknown 490\n" +
			"  tarnlight plan mysurvey/absorbance/TRP-4.csv --emission 300:450",
		Args: cobra.ExactArgs(1),
	}
	o.flags(c)
	c.RunE = func(c *cobra.Command, args []string) error {
		o.from = args[0]
		return runPlan(c.Context(), s, o)
	}
	return c
}

func (o *planOptions) flags(c *cobra.Command) {
	f := c.Flags()
	f.IntVar(&o.scans, "scans", 8, "the most scans to plan for")
	f.Float64SliceVar(&o.with, "with", nil, "excitation, nm, that is part of every plan (350 for Raman units); may be given again")
	f.StringArrayVar(&o.apart, "apart", nil, "component that must be kept apart although nobody wants its value; may be given again")
	f.StringArrayVar(&o.unknown, "unknown", nil, "EMISSION[:WIDTH], nm, of an interferent nobody has spectra of: a band free at every excitation (width at half height, default 80)")
	f.StringArrayVar(&o.levels, "level", nil, "NAME=AMOUNT of a component in a typical bottle, in its own unit")
	f.StringArrayVar(&o.limits, "limit", nil, "NAME=AMOUNT: detection limit that the plan must meet; may be given again")
	f.BoolVar(&o.worst, "worst", false, "make the largest relative uncertainty small, not their root mean square")
	f.StringVar(&o.like, "like", "", "survey folder measured on the same instrument: noise, scatter bands, typical levels and departures from the model are taken from it")
	f.Float64Var(&o.read, "read", 0, "standard deviation of a cell without light, in the intensity unit of the references")
	f.Float64Var(&o.shot, "shot", 0, "variance that light adds to a cell for one of intensity, in the same unit")
	f.IntVar(&o.blanks, "blanks", -1, "how many blanks the subtracted one is the mean of (default: as in the survey, else 3; 0: none)")
	f.StringVar(&o.settings, "settings", "", "settings file for scatter bands and inner filter (default SURVEY/survey.toml, else the defaults)")
	f.StringVar(&o.absorbance, "absorbance", "", "absorbance file of a typical bottle (default: the median sample of the survey)")
	f.Float64Var(&o.pathCM, "path-cm", 1, "path of the absorbance file, cm")
	f.Float64Var(&o.times, "times", 1, "how much of the absorbance in the file the bottles to come have")
	f.StringVar(&o.excitation, "excitation", "", "FROM:TO, nm: range of the excitations to choose from")
	f.StringVar(&o.emission, "emission", "", "FROM:TO[:STEP], nm: emission range and step of the scans (default: the grid's)")
	f.Float64Var(&o.narrow, "narrow", 0, "percent by which the uncertainty may grow for a narrower emission range, and with --dwell a wider step")
	f.Float64Var(&o.time.NMPerMinute, "speed", 600, "scan speed, nm a minute; 0 with --dwell")
	f.Float64Var(&o.time.SettleSeconds, "settle", 5, "seconds a scan beside that: setting the excitation, going back, shutter")
	f.Float64Var(&o.time.DwellSeconds, "dwell", 0, "seconds a point, where the instrument stops at each")
	f.Uint64Var(&o.seed, "seed", 1, "of the random starts")
	f.IntVar(&o.draw, "draw", 0, "number of scans whose lines are drawn over the references (default: the plan named last)")
	f.StringVarP(&o.out, "out", "o", "", "CSV file for the whole table")
	f.StringVar(&o.figures, "figures", "", "folder for the pictures (SVG, PNG, and their numbers as CSV)")
	f.BoolVar(&o.json, "json", false, "as JSON")
}

// check says what is wrong with the options.
func (o planOptions) check() error {
	switch {
	case o.scans < 1:
		return misuse("--scans %d; write 1 or more", o.scans)
	case o.read < 0 || o.shot < 0:
		return misuse("--read %g, --shot %g; write numbers of 0 or more, at least one of them above", o.read, o.shot)
	case o.like != "" && o.read+o.shot > 0:
		return misuse("--like and --read or --shot both state the noise; keep one of them")
	case !(o.pathCM > 0):
		return misuse("--path-cm %g; write a path above 0", o.pathCM)
	case !(o.times > 0):
		return misuse("--times %g; write a number above 0", o.times)
	case !(o.narrow >= 0):
		return misuse("--narrow %g; write a percentage of 0 or more", o.narrow)
	case !(o.time.NMPerMinute >= 0 && o.time.SettleSeconds >= 0 && o.time.DwellSeconds >= 0) || o.time.NMPerMinute+o.time.DwellSeconds == 0:
		return misuse("--speed %g, --settle %g, --dwell %g; write times of 0 or more, and a speed or a dwell above 0", o.time.NMPerMinute, o.time.SettleSeconds, o.time.DwellSeconds)
	}
	return nil
}

func runPlan(ctx context.Context, s streams, o planOptions) error {
	if err := o.check(); err != nil {
		return err
	}
	if _, err := os.Stat(o.from); err != nil {
		return fmt.Errorf("%s: no such file or folder; give a survey folder, a model.json, a reference file in the layout of components.csv, or an absorbance file", o.from)
	}
	one, err := o.isAbsorbance()
	switch {
	case err != nil:
		return err
	case one:
		return runAlone(s, o)
	}
	r, err := o.plan(ctx, s)
	if err != nil {
		return err
	}
	for _, n := range r.Notes {
		fmt.Fprintln(s.err, n)
	}
	if o.json {
		err = printJSON(s.out, r)
	} else {
		err = r.print(s.out)
	}
	if err == nil {
		err = o.writeFiles(s, r)
	}
	if err == nil && r.doubt {
		err = &codeError{code: exitDoubt}
	}
	return err
}

// plan does everything up to the result.
func (o planOptions) plan(ctx context.Context, s streams) (*planResult, error) {
	in, err := o.input(ctx, s)
	if err != nil {
		return nil, err
	}
	if err := in.wishes(o); err != nil {
		return nil, err
	}
	design, err := plan.New(in.problem)
	if err != nil {
		return nil, err
	}
	must, err := linesAt(in.problem.Set.Grid.Ex, o.with, design.Lines())
	if err != nil {
		return nil, err
	}
	limits, err := amounts("--limit", o.limits, in.problem.Set.Names())
	if err != nil {
		return nil, err
	}
	b := newBar(s.err)
	choices, err := design.Plans(ctx, max(o.scans, len(must)), &plan.Settings{Must: must, Seed: o.seed, Progress: b.step})
	if err != nil {
		return nil, err
	}
	return in.result(o, design, choices, limits), nil
}

// writeFiles writes what was asked for beside the standard output.
func (o planOptions) writeFiles(s streams, r *planResult) error {
	if o.out != "" {
		var b bytes.Buffer
		if err := r.table().Write(&b); err != nil {
			return err
		}
		if err := os.WriteFile(o.out, b.Bytes(), 0o644); err != nil {
			return err
		}
		fmt.Fprintf(s.err, "table: %s\n", o.out)
	}
	if o.figures == "" {
		return nil
	}
	if err := os.MkdirAll(o.figures, 0o755); err != nil {
		return err
	}
	d, err := r.drawing(o.draw)
	if err != nil {
		return err
	}
	if err := report.PlanFigures(o.figures, d); err != nil {
		return err
	}
	fmt.Fprintf(s.err, "pictures: %s\n", filepath.Join(o.figures, "plan-lines.png"))
	return nil
}
