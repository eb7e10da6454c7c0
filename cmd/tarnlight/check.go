package main

import (
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"tarnlight/eem"
)

// newCheckCmd reads everything and changes nothing.
func newCheckCmd(s streams) *cobra.Command {
	o := jobOptions{verb: "check"}
	c := &cobra.Command{
		Use:   "check SURVEY",
		Short: "Before: can this be run? Reads everything, changes nothing, says what is wrong",
		Long: `check reads run sheet, settings and every raw file, corrects the bottles in memory
and says what it found: how files were taken, what each batch has, and every doubt
with file and line. Nothing is written.`,
		Example: "  tarnlight check mysurvey",
		Args:    cobra.ExactArgs(1),
	}
	c.Flags().StringVar(&o.settings, "settings", "", "settings file (default SURVEY/survey.toml)")
	c.Flags().IntVar(&o.workers, "workers", 0, "how many bottles at a time (default: all cores)")
	c.Flags().BoolVar(&o.strict, "strict", false, "exit 1 when a bottle was rejected")
	c.RunE = func(c *cobra.Command, args []string) error { o.dir = args[0]; return runCheck(c.Context(), s, o) }
	return c
}

func runCheck(ctx context.Context, s streams, o jobOptions) error {
	j := &job{jobOptions: o, streams: s, bar: newBar(s.err)}
	if err := j.readInputs(); err != nil {
		return err
	}
	if err := j.prepare(ctx); err != nil {
		return err
	}
	j.flags = j.sv.Flags
	t := newText("batch", "bottles", "blanks", "unit", "verdict", "why")
	for _, bt := range j.sv.Batches {
		verdict, why := bt.Verdict()
		reason := ""
		if len(why) > 0 {
			reason = why[0]
		}
		t.add(bt.Name, fmt.Sprint(len(bt.Bottles)), fmt.Sprint(len(bt.Blanks)), string(j.sv.Unit), verdict, reason)
	}
	fmt.Fprintf(s.out, "grid: %s\n", j.sv.Grid)
	if err := t.print(s.out); err != nil {
		return err
	}
	for _, f := range j.flags {
		if f.Severity < eem.Doubt {
			continue
		}
		place := ""
		if f.File != "" {
			if place = f.File; f.Line > 0 {
				place += fmt.Sprintf(":%d", f.Line)
			}
			place += ": "
		}
		fmt.Fprintf(s.out, "%s: %s%s\n", f.Severity, place, flagLine(f))
	}
	st := j.status()
	fmt.Fprintf(s.err, "%d bottles: %d usable, %d rejected, %d excluded; %d doubts, %d notes\n", st.Bottles["all"], st.Bottles["usable"],
		st.Bottles["rejected"], st.Bottles["excluded"], st.Findings["doubts"], st.Findings["notes"])
	if st.ExitCode != exitDone {
		return &codeError{code: st.ExitCode}
	}
	return nil
}
