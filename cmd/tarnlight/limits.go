package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

type limitsOptions struct {
	dir, settings string
	form, method  string
	out           string
	workers       int
}

// limitForms are the words of --form.
var limitForms = map[string]string{"currie": merit.FormCurrie, "iso": merit.FormISO, "mdl": merit.FormMDL}

// newLimitsCmd makes the laboratory's own limits file.
func newLimitsCmd(s streams) *cobra.Command {
	var o limitsOptions
	c := &cobra.Command{
		Use:   "limits STUDY",
		Short: "Makes the laboratory's own limits file from replicates at a low level and blanks",
		Long: `limits reads a study, an ordinary survey folder or the results of one, and makes the
file that [quantify] limits takes. A study holds, measured on three days or more like
any sample, in a water like the samples' (limits from pure water hold for pure water):

  replicates  at least 7 bottles of one low amount, 2 to 10 times the limit hoped for:
              kind control with its conc: columns (those of equal amounts belong
              together), or sample where the water holds it by itself, the others naming
              the first in replicate_of
  blanks      at least 7: field-blank for those handled like a sample (best), blank for
              those that are subtracted

The table shows each published form with what it rests on, and why one is refused:

  Currie       critical value and detection limit at 5 % risk each, from the scatter of a
               measurement on a day of its own, with Student's t
  ISO 11843-2  the same from the line of low standards
  MDL          t(0.99)·s, above the mean of blanks: critical value and detection limit in one
               (40 CFR 136, appendix B)

Of several bases of the chosen form the one with the largest detection limit counts. A
limit that rests on blanks alone is written, said, and ends with 3.`,
		Example: "  tarnlight limits mystudy -o limits.csv\n  tarnlight limits mystudy/out --form mdl",
		Args:    cobra.ExactArgs(1),
	}
	f := c.Flags()
	f.StringVar(&o.form, "form", "currie", "published form that sets the limits: currie, iso or mdl")
	f.StringVar(&o.method, "method", "references", "which contributions: references, parafac or model; a study folder gives references")
	f.StringVar(&o.settings, "settings", "", "settings file (default STUDY/survey.toml)")
	f.IntVar(&o.workers, "workers", 0, "how many bottles at a time (default: all cores; results do not depend on it)")
	f.StringVarP(&o.out, "out", "o", "", "file for the limits (default: only the table)")
	c.RunE = func(c *cobra.Command, args []string) error {
		o.dir = args[0]
		return runLimits(c.Context(), s, o)
	}
	return c
}

func runLimits(ctx context.Context, s streams, o limitsOptions) error {
	form, ok := limitForms[o.form]
	if !ok {
		return misuse("--form %q; write currie, iso or mdl", o.form)
	}
	t, err := o.table(ctx, s)
	if err != nil {
		return err
	}
	rows := o.rows(t)
	if len(rows) == 0 {
		return fmt.Errorf("%s has no limits of method %s; --method names another", o.dir, o.method)
	}
	chosen, missing := o.choose(t, rows, form)
	if err := printLimits(s, t, rows, chosen); err != nil {
		return err
	}
	doubt := tellLow(s, t, rows, chosen)
	doubt = tellBlanks(s, t, rows, chosen) || doubt
	for _, name := range missing {
		doubt = true
		fmt.Fprintf(s.err, "%s: no limit can be set by %s; it is left out of the file\n", name, form)
	}
	for _, i := range chosen {
		if note := t.Text(i, t.Col("note")); note != "" {
			doubt = true
			fmt.Fprintf(s.err, "%s: %s\n", t.Text(i, t.Col("component")), note)
		}
	}
	if len(chosen) == 0 {
		return fmt.Errorf("the study sets no limit by %s; the table tells why", form)
	}
	if o.out != "" {
		if err := writeNew(o.out, limitsFile(t, chosen)); err != nil {
			return err
		}
		fmt.Fprintf(s.err, "%s: limits of %s; settings take it as [quantify] limits\n", o.out, eem.Count(len(chosen), "component"))
	}
	if doubt {
		return &codeError{code: exitDoubt}
	}
	return nil
}

// tellLow says which limits lie far below those that the budgets of the study's own
// samples give, and whether there are any.
func tellLow(s streams, t *report.Table, rows, chosen []int) bool {
	told := false
	for _, i := range chosen {
		for _, h := range rows {
			same := t.Text(h, t.Col("component")) == t.Text(i, t.Col("component")) && t.Text(h, t.Col("form")) == formSurvey
			own, here := t.Float(i, t.Col("critical_value")), t.Float(h, t.Col("critical_value"))
			if same && here > 2*own {
				told = true
				fmt.Fprintf(s.err, "%s: in the samples the budgets give a critical value %s times as high; this limit holds for water with as little else in it as the study's\n",
					t.Text(i, t.Col("component")), short(here/own))
			}
		}
	}
	return told
}

// tellBlanks says which limits rest on blanks alone, and whether there are any.
func tellBlanks(s streams, t *report.Table, rows, chosen []int) bool {
	blank := func(i int) bool {
		return slices.Contains([]string{basisBlanks, basisFieldBlanks}, t.Text(i, t.Col("basis")))
	}
	var names []string
	for _, i := range chosen {
		other := slices.ContainsFunc(rows, func(h int) bool {
			return !blank(h) && t.Bool(h, t.Col("usable")) && t.Text(h, t.Col("form")) == t.Text(i, t.Col("form")) &&
				t.Text(h, t.Col("component")) == t.Text(i, t.Col("component"))
		})
		if blank(i) && !other {
			names = append(names, t.Text(i, t.Col("component")))
		}
	}
	if len(names) > 0 {
		fmt.Fprintf(s.err, "%s: set by blanks alone, as no replicates at a low level could be taken; nothing shows that so little is found when it is there: measure at least 7 controls of one low amount\n", list(names))
	}
	return len(names) > 0
}

// table is limits.csv of the study: as its results hold it, or made now.
func (o limitsOptions) table(ctx context.Context, s streams) (*report.Table, error) {
	if isResults(o.dir) {
		t, err := report.ReadTable(filepath.Join(o.dir, "limits.csv"))
		if os.IsNotExist(err) {
			return nil, fmt.Errorf("%s has no limits.csv; run its survey again", o.dir)
		}
		return t, err
	}
	j := &job{jobOptions: jobOptions{dir: o.dir, settings: o.settings, workers: o.workers, quantify: true}, streams: s, bar: newBar(s.err)}
	if err := j.readInputs(); err != nil {
		return nil, err
	}
	if err := j.prepare(ctx); err != nil {
		return nil, err
	}
	if err := j.quantifyPart(); err != nil {
		return nil, err
	}
	if len(j.res) == 0 {
		return nil, fmt.Errorf("%s: nothing to quantify against; give the study standards with conc: columns, or name a reference file ([quantify] references)", o.dir)
	}
	return j.limitsTable(), nil
}

// rows are those of the method, by component; without what a study of no samples
// lacks.
func (o limitsOptions) rows(t *report.Table) []int {
	var out []int
	for i := range t.Rows {
		if t.Text(i, t.Col("method")) == o.method && (t.Text(i, t.Col("detection_limit")) != "" || !t.Bool(i, t.Col("usable"))) {
			out = append(out, i)
		}
	}
	return out
}

// choose returns for every component the row of a form that sets its limits, the
// one with the largest detection limit, and the components that have none.
func (o limitsOptions) choose(t *report.Table, rows []int, form string) (chosen []int, missing []string) {
	best := map[string]int{}
	var names []string
	for _, i := range rows {
		name := t.Text(i, t.Col("component"))
		if !slices.Contains(names, name) {
			names = append(names, name)
		}
		d := t.Float(i, t.Col("detection_limit"))
		if t.Text(i, t.Col("form")) != form || !t.Bool(i, t.Col("usable")) || !(d > 0) || !(t.Float(i, t.Col("critical_value")) > 0) {
			continue
		}
		if was, ok := best[name]; !ok || d > t.Float(was, t.Col("detection_limit")) {
			best[name] = i
		}
	}
	for _, name := range names {
		if i, ok := best[name]; ok {
			chosen = append(chosen, i)
		} else {
			missing = append(missing, name)
		}
	}
	return chosen, missing
}

// printLimits prints the table: a star marks the rows that set limits.
func printLimits(s streams, t *report.Table, rows, chosen []int) error {
	out := newText("", "component", "form", "basis", "n", "batches", "mean", "s", "within", "between", "critical", "detection", "unit")
	num := func(i int, column string) string {
		if v := t.Float(i, t.Col(column)); v == v {
			return fmt.Sprintf("%.3g", v)
		}
		return ""
	}
	var why refusals
	for _, i := range rows {
		text := func(c string) string { return t.Text(i, t.Col(c)) }
		mark, critical, detection := "", num(i, "critical_value"), num(i, "detection_limit")
		if slices.Contains(chosen, i) {
			mark = "*"
		}
		if !t.Bool(i, t.Col("usable")) {
			critical, detection = "refused", ""
			why.add(text("component"), text("basis"), text("note"))
		}
		out.add(mark, text("component"), text("form"), text("basis"), text("n"), text("batches"), num(i, "mean"), num(i, "sd_total"), num(i, "sd_within"),
			num(i, "sd_between"), critical, detection, text("unit"))
	}
	if err := out.print(s.out); err != nil {
		return err
	}
	for _, r := range why {
		if _, err := fmt.Fprintf(s.out, "refused, %s (%s): %s\n", r.basis, strings.Join(r.components, ", "), r.note); err != nil {
			return err
		}
	}
	return nil
}

// refusals gathers the components that are refused on one basis for one reason.
type refusals []struct {
	basis, note string
	components  []string
}

func (r *refusals) add(component, basis, note string) {
	for i := range *r {
		if e := &(*r)[i]; e.basis == basis && e.note == note {
			if !slices.Contains(e.components, component) {
				e.components = append(e.components, component)
			}
			return
		}
	}
	*r = append(*r, struct {
		basis, note string
		components  []string
	}{basis, note, []string{component}})
}

// limitsFile is the file that [quantify] limits takes; what follows the unit tells
// where a row comes from.
func limitsFile(t *report.Table, chosen []int) []byte {
	columns := []string{"component", "detection_limit", "critical_value", "quantification_limit", "unit", "form", "basis", "n", "batches", "mean", "sd_total", "degrees_of_freedom"}
	out := &report.Table{Columns: columns}
	for _, i := range chosen {
		row := make([]any, len(columns))
		for c, name := range columns {
			row[c] = t.Text(i, t.Col(name))
		}
		out.Append(row...)
	}
	var b bytes.Buffer
	if err := out.Write(&b); err != nil {
		panic(err) // a buffer takes everything
	}
	return []byte(strings.ReplaceAll(b.String(), "\r", ""))
}
