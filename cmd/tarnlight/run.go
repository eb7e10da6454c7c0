package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"
)

// jobCmd makes a verb that works on one survey.
func jobCmd(s streams, o jobOptions, c *cobra.Command) *cobra.Command {
	o.verb = c.Name()
	o.flags(c)
	c.Args = cobra.ExactArgs(1)
	c.RunE = func(c *cobra.Command, args []string) error {
		o.dir = args[0]
		return runJob(c.Context(), s, o)
	}
	return c
}

// newRunCmd is the whole job.
func newRunCmd(s streams) *cobra.Command {
	return jobCmd(s, jobOptions{quantify: true, resolve: true}, &cobra.Command{
		Use:   "run SURVEY",
		Short: "The whole job: read, correct, quantify and/or resolve, report",
		Long: `run reads the run sheet and the raw files of a survey folder, corrects every
bottle, resolves the mixtures against the standards (or without references where
there are none) and writes the results to SURVEY/out. Raw files are never touched;
older results stay whole until the new ones are complete, and are then kept in
out.previous.`,
		Example: "  tarnlight run mysurvey\n  tarnlight run mysurvey --out results --json",
	})
}

// newQuantifyCmd is the part with references.
func newQuantifyCmd(s streams) *cobra.Command {
	return jobCmd(s, jobOptions{quantify: true}, &cobra.Command{
		Use:     "quantify SURVEY",
		Short:   "Only against references: the sheet's standards or a reference file",
		Example: "  tarnlight quantify mysurvey",
	})
}

// newResolveCmd is the part without references.
func newResolveCmd(s streams) *cobra.Command {
	return jobCmd(s, jobOptions{resolve: true}, &cobra.Command{
		Use:     "resolve SURVEY",
		Short:   "Only without references: PARAFAC on the survey's samples",
		Example: "  tarnlight resolve mysurvey",
	})
}

// runJob does the job and says how it ended.
func runJob(ctx context.Context, s streams, o jobOptions) error {
	j, err := o.execute(ctx, s)
	if err != nil {
		if o.json {
			why := err.Error()
			if errors.Is(err, context.Canceled) {
				why = interrupted
			}
			if told := emit(s, failedEvent{"failed", why}); told != nil {
				return told
			}
		}
		return err
	}
	if o.json {
		err = j.emitAll(s)
	} else {
		err = j.printSummary(s)
	}
	if err != nil {
		return err
	}
	if code := j.status().ExitCode; code != exitDone {
		return &codeError{code: code}
	}
	return nil
}

// printSummary ends a run: a compact table on out, what to look at first on err.
func (j *job) printSummary(s streams) error {
	st := j.status()
	if idle := st.SinceLast && st.Bottles["new"] == 0; idle {
		fmt.Fprintln(s.err, "nothing is new: the last results hold every bottle already")
	} else if err := j.printOutcome(s, st); err != nil {
		return err
	}
	if w := st.ReasonGroups; len(w) > 0 {
		fmt.Fprintln(s.err, "look at first:")
		for _, r := range w[:min(3, len(w))] {
			fmt.Fprintf(s.err, "  %s\n", r.line())
		}
	}
	if _, err := os.Stat(j.out + ".previous"); err == nil && st.Bottles["usable"] == 0 {
		fmt.Fprintf(s.err, "not one bottle can be used; the results before these are whole in %s.previous\n", j.out)
	}
	name := "contributions.csv"
	if j.pictures {
		name = "report.html"
	}
	fmt.Fprintf(s.err, "results: %s\n", filepath.Join(j.out, name))
	return nil
}

// printOutcome tells what was found: components on out, bottles on err.
func (j *job) printOutcome(s streams, st status) error {
	t := newText("component", "method", "detected", "of", "lowest", "median", "highest", "unit")
	for k := range j.judge {
		for f, c := range j.res[k].Set.Components {
			v, n, unit := j.detectedValues(k, f)
			row := []string{c.Name, j.res[k].Set.Method, fmt.Sprint(len(v)), fmt.Sprint(n), "", "", "", unit}
			if len(v) > 0 {
				row[4], row[5], row[6] = short(v[0]), short(median(v)), short(v[len(v)-1])
			}
			t.add(row...)
		}
	}
	if err := t.print(s.out); err != nil {
		return err
	}
	fmt.Fprintln(s.err, st.line())
	j.tellChances(s.err)
	return nil
}
