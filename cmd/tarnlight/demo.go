package main

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/synth"
)

type demoOptions struct {
	dir  string
	seed uint64
}

// newDemoCmd writes an invented survey with known truth and runs it.
func newDemoCmd(s streams) *cobra.Command {
	o := demoOptions{dir: "tarnlight-demo"}
	c := &cobra.Command{
		Use:   "demo [DIR]",
		Short: "An invented survey with known truth: written, run, and held against the truth",
		Long: `demo writes the raw files of an invented survey (three days on an invented
catchment, with a few things gone wrong) into DIR, runs the whole job on them, and
prints how close each component came to the truth and which of the planted faults
were found.`,
		Example: "  tarnlight demo\n  tarnlight demo elsewhere --seed 7",
		Args:    cobra.MaximumNArgs(1),
	}
	c.Flags().Uint64Var(&o.seed, "seed", 1, "seed of the invented numbers")
	c.RunE = func(c *cobra.Command, args []string) error {
		if len(args) == 1 {
			o.dir = args[0]
		}
		return runDemo(c.Context(), s, o)
	}
	return c
}

func runDemo(ctx context.Context, s streams, o demoOptions) error {
	sv := synth.Demo(o.seed)
	if err := os.MkdirAll(o.dir, 0o755); err != nil {
		return err
	}
	if err := sv.Write(o.dir); err != nil {
		return err
	}
	fmt.Fprintf(s.err, "%d invented bottles written to %s\n", len(sv.Bottles), o.dir)
	j, err := jobOptions{dir: o.dir, quantify: true, resolve: true, pictures: true, verb: "demo"}.execute(ctx, s)
	if err != nil {
		return err
	}
	if err := j.againstTruth(s, sv); err != nil {
		return err
	}
	j.foundInNothing(s, sv)
	missed := j.faultsFound(s, sv)
	fmt.Fprintf(s.err, "the report: %s\n", filepath.Join(j.out, "report.html"))
	if missed > 0 {
		return fmt.Errorf("%d planted faults were not found", missed)
	}
	return nil
}

// againstTruth prints how close each component came.
func (j *job) againstTruth(s streams, sv *synth.Survey) error {
	type key struct{ id, component string }
	truth := map[key]float64{}
	for _, r := range sv.Truth() {
		truth[key{r.ID, r.Component}] = r.Value
	}
	t := newText("component", "bottles", "median error", "90 % within", "worst", "of bottle")
	for k, judged := range j.judge {
		if j.res[k].Set.Method != "references" {
			continue
		}
		for _, c := range j.res[k].Set.Components {
			type miss struct {
				id string
				e  float64
			}
			var errs []miss
			for _, x := range judged.Contributions {
				want, known := truth[key{x.ID, x.Component}]
				if x.Component == c.Name && known && want > 0 && x.Value > x.Quantification && x.Qualifier == "" {
					errs = append(errs, miss{x.ID, 100 * math.Abs(x.Value/want-1)})
				}
			}
			if len(errs) == 0 {
				t.add(c.Name, "0", "", "", "", "")
				continue
			}
			slices.SortFunc(errs, func(a, b miss) int {
				if a.e < b.e {
					return -1
				}
				return 1
			})
			n := len(errs)
			v := make([]float64, n)
			for i, m := range errs {
				v[i] = m.e
			}
			pc := func(x float64) string { return fmt.Sprintf("%.2f %%", x) }
			t.add(c.Name, fmt.Sprint(n), pc(median(v)), pc(v[(n*9+9)/10-1]), pc(v[n-1]), errs[n-1].id)
		}
	}
	return t.print(s.out)
}

// foundInNothing says how often a component was found where there is none: a rule
// of 5 % risk is wrong now and then, and a demo that hid it would be no demo.
func (j *job) foundInNothing(s streams, sv *synth.Survey) {
	none := map[[2]string]bool{}
	for _, r := range sv.Truth() {
		if r.Value == 0 {
			none[[2]string{r.ID, r.Component}] = true
		}
	}
	n, wrong := 0, 0
	for k, judged := range j.judge {
		for _, x := range judged.Contributions {
			if j.res[k].Set.Method == "references" && none[[2]string{x.ID, x.Component}] && (x.Qualifier == "" || x.Qualifier == "U") {
				n++
				if x.Detected {
					wrong++
				}
			}
		}
	}
	fmt.Fprintf(s.err, "found where there is nothing, without a doubt: %d of %d (at a risk of 5 %% each, bottles of one survey sharing the errors of its standards)\n", wrong, n)
}

// faultsFound says of every planted fault whether a flag names it, and returns
// how many do not.
func (j *job) faultsFound(s streams, sv *synth.Survey) (missed int) {
	for _, f := range sv.Faults() {
		found := slices.ContainsFunc(j.flags, func(x eem.Flag) bool { return x.ID == f.ID && x.Test == f.Test })
		word := "found"
		if !found {
			word = "MISSED"
			missed++
		}
		fmt.Fprintf(s.err, "planted in %s, %s: %s (%s)\n", f.ID, f.Words, word, f.Test)
	}
	return missed
}
