package main

import (
	"context"
	"fmt"
	"io"
	"slices"
	"strings"

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
		verdict, why := j.verdict(bt)
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
	if err := printFindings(s.out, j.flags); err != nil {
		return err
	}
	st := j.status()
	fmt.Fprintln(s.err, st.line())
	if st.ExitCode != exitDone {
		return &codeError{code: st.ExitCode}
	}
	return nil
}

// few is how many findings of one test are told one by one.
const few = 3

// printFindings tells what was found: rejects and doubts one by one, with place,
// where they are few; many of one test, and notes, on one line.
func printFindings(w io.Writer, flags []eem.Flag) error {
	for _, sev := range []eem.Severity{eem.Reject, eem.Doubt, eem.Remark} {
		byTest := map[string][]eem.Flag{}
		var order []string
		for _, f := range flags {
			if f.Severity == sev {
				if byTest[f.Test] == nil {
					order = append(order, f.Test)
				}
				byTest[f.Test] = append(byTest[f.Test], f)
			}
		}
		for _, test := range order {
			list := byTest[test]
			if len(list) <= few && sev > eem.Remark {
				for _, f := range list {
					if _, err := fmt.Fprintf(w, "%s: %s%s\n", sev, place(f), flagLine(f)); err != nil {
						return err
					}
				}
				continue
			}
			var ids []string
			for _, f := range list {
				if f.ID != "" && !slices.Contains(ids, f.ID) {
					ids = append(ids, f.ID)
				}
			}
			who := ""
			if len(ids) > 0 {
				who = fmt.Sprintf("%s (%s): ", eem.Count(len(ids), "bottle"), some(ids))
				if len(ids) > 1 && list[0].ID != "" && slices.ContainsFunc(list, func(f eem.Flag) bool { return f.Msg != list[0].Msg }) {
					who = strings.TrimSuffix(who, ": ") + ", such as " + list[0].ID + ": "
				}
			}
			if _, err := fmt.Fprintf(w, "%s: %s%s (%s)\n", sev, who, list[0].Msg, test); err != nil {
				return err
			}
		}
	}
	return nil
}

// place names file and line of a finding.
func place(f eem.Flag) string {
	switch {
	case f.File == "":
		return ""
	case f.Line > 0:
		return fmt.Sprintf("%s:%d: ", f.File, f.Line)
	}
	return f.File + ": "
}
