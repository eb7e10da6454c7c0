package main

import (
	"context"
	"encoding/csv"
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/report"
)

type explainOptions struct {
	out, id, survey, cell string
	csv, json             bool
}

// newExplainCmd tells where one bottle's numbers come from.
func newExplainCmd(s streams) *cobra.Command {
	var o explainOptions
	c := &cobra.Command{
		Use:   "explain OUT ID",
		Short: "Where one bottle's numbers come from: files, steps, blanks, scale, model, flags, rounding",
		Long: `explain reads the raw files of one bottle and its blanks again, repeats every step with
the settings of the results, and shows for one cell what each step made of it, from
the counts in the file to the number in survey.nc; then what was masked and why, the
contributions with their rounding, and every finding on the bottle. It says so where
raw files have changed since. Numbers are shown with seven digits; --csv and --json have
all of them, so that the chain can be computed again.`,
		Example: "  tarnlight explain tarnlight-demo/out W201\n  tarnlight explain tarnlight-demo/out W201 --cell 275,340 --csv",
		Args:    cobra.ExactArgs(2),
	}
	c.Flags().StringVar(&o.survey, "survey", "", "survey folder (default: the folder that holds OUT)")
	c.Flags().StringVar(&o.cell, "cell", "", "the cell to follow, EX,EM in nm (default: the bottle's brightest)")
	c.Flags().BoolVar(&o.csv, "csv", false, "one table for a spreadsheet")
	c.Flags().BoolVar(&o.json, "json", false, "as JSON")
	c.RunE = func(c *cobra.Command, args []string) error {
		o.out, o.id = args[0], args[1]
		return runExplain(c.Context(), s, o)
	}
	return c
}

// explained is one line of the explanation.
type explained struct {
	Section string `json:"section"`
	Item    string `json:"item"`
	Value   string `json:"value"`
	Unit    string `json:"unit"`
	Note    string `json:"note"`
}

// explainer gathers the lines.
type explainer struct {
	explainOptions
	lines  []explained
	store  *report.Store
	sample *report.StoreSample
	bottle *prepare.Bottle
	sv     *prepare.Survey
	ex, em float64
	at     int // index of the cell in the results' grid
	digits int // of a stated uncertainty
}

func (x *explainer) add(section, item, value, unit, note string) {
	x.lines = append(x.lines, explained{section, item, value, unit, note})
}

func runExplain(ctx context.Context, s streams, o explainOptions) error {
	if o.survey == "" {
		o.survey = filepath.Dir(filepath.Clean(o.out))
	}
	if err := resultsFolder(o.out); err != nil {
		return err
	}
	x := &explainer{explainOptions: o}
	if err := x.open(); err != nil {
		return err
	}
	defer x.store.Close() //nolint:errcheck // read only
	if err := x.repeat(ctx); err != nil {
		return err
	}
	if err := x.tables(); err != nil {
		return err
	}
	switch {
	case o.json:
		return printJSON(s.out, x.lines)
	case o.csv:
		w := csv.NewWriter(s.out)
		if err := w.Write([]string{"section", "item", "value", "unit", "note"}); err != nil {
			return err
		}
		for _, l := range x.lines {
			if err := w.Write([]string{l.Section, l.Item, l.Value, l.Unit, l.Note}); err != nil {
				return err
			}
		}
		w.Flush()
		return w.Error()
	}
	return x.print(s)
}

// print shows the lines section by section.
func (x *explainer) print(s streams) error {
	for i := 0; i < len(x.lines); {
		section := x.lines[i].Section
		t := newText(section, "", "", "")
		for ; i < len(x.lines) && x.lines[i].Section == section; i++ {
			t.add("  "+x.lines[i].Item, onScreen(x.lines[i].Value), x.lines[i].Unit, x.lines[i].Note)
		}
		if err := t.print(s.out); err != nil {
			return err
		}
	}
	return nil
}

// onScreen is a value with seven significant digits at most, which is what anybody
// reads; the table for a spreadsheet keeps those that the chain is computed with.
func onScreen(value string) string {
	v, err := strconv.ParseFloat(value, 64)
	if err != nil || len(value) < 9 || math.IsNaN(v) || math.IsInf(v, 0) {
		return value
	}
	return inFull(v, 7)
}

// open finds the bottle in the results and the cell to follow.
func (x *explainer) open() error {
	var err error
	if x.store, err = report.OpenStore(filepath.Join(x.out, report.StoreName)); err != nil {
		return err
	}
	i := slices.Index(x.store.IDs, x.id)
	if i < 0 {
		return fmt.Errorf("%s has no bottle %q; %s", x.out, x.id, meant(x.id, x.store.IDs))
	}
	if x.sample, err = x.store.Sample(i); err != nil {
		return err
	}
	g := x.store.Grid
	if x.cell == "" {
		x.at = -1
		for c, v := range x.sample.Corrected {
			if x.sample.Why[c] == eem.Measured && !math.IsNaN(v) && (x.at < 0 || v > x.sample.Corrected[x.at]) {
				x.at = c
			}
		}
		if x.at < 0 {
			x.at = 0
		}
		x.ex, x.em = g.Ex.At(x.at/g.Em.Len()), g.Em.At(x.at%g.Em.Len())
		return nil
	}
	a, b, ok := strings.Cut(x.cell, ",")
	ex, err1 := strconv.ParseFloat(strings.TrimSpace(a), 64)
	em, err2 := strconv.ParseFloat(strings.TrimSpace(b), 64)
	if !ok || err1 != nil || err2 != nil {
		return misuse("--cell %q: give excitation and emission in nm, such as 275,340", x.cell)
	}
	j, okJ := g.Ex.Find(ex)
	k, okK := g.Em.Find(em)
	if !okJ || !okK {
		return misuse("--cell %q is no point of the results' grid (%s)", x.cell, g)
	}
	x.ex, x.em, x.at = ex, em, g.Index(j, k)
	return nil
}

func some(ids []string) string {
	if len(ids) > 8 {
		return strings.Join(ids[:8], ", ") + fmt.Sprintf(" and %d more", len(ids)-8)
	}
	return strings.Join(ids, ", ")
}

// repeat does the steps again for the bottle and what it rests on, and follows
// the cell.
func (x *explainer) repeat(ctx context.Context) error {
	set, err := survey.ReadSettings(filepath.Join(x.out, "settings-used.toml"))
	if err != nil {
		return err
	}
	x.digits = set.Report.Digits
	sheet, err := survey.ReadSheet(x.survey, set)
	if err != nil {
		return err
	}
	row, ok := sheet.Find(x.id)
	if !ok {
		return fmt.Errorf("%s has no row %q any more", sheet.Path, x.id)
	}
	less := *sheet
	less.Rows = nil
	for _, r := range sheet.Rows {
		if r.ID == row.ID || r.Kind == survey.Blank || (x.store.Unit == eem.Quinine && r.Kind == survey.Standard) {
			less.Rows = append(less.Rows, r)
		}
	}
	type moment struct {
		step string
		unit eem.Unit
		v    float64
		why  eem.Reason
		note string
	}
	var moments []moment
	var mu sync.Mutex
	grid := x.store.Grid
	x.sv, err = prepare.Read(ctx, x.survey, &less, set, prepare.Options{Grid: &grid, KeepUnit: true, Trace: func(b *prepare.Bottle, step string, e *eem.EEM) {
		if b.Row.ID != x.id {
			return
		}
		one := e.Regrid(grid)
		note := ""
		for _, n := range e.Notes {
			if n.Step == step && n.Test == "" {
				note = n.Msg
			}
		}
		mu.Lock()
		moments = append(moments, moment{step, e.Unit, one.F[x.at], one.Why[x.at], note})
		mu.Unlock()
	}})
	if err != nil {
		return err
	}
	for _, b := range x.sv.Bottles {
		if b.Row.ID == x.id {
			x.bottle = b
		}
	}
	x.sources()
	section := fmt.Sprintf("cell ex %g / em %g nm", x.ex, x.em)
	for i, m := range moments {
		note := m.note
		if i > 0 && note == "" && m.v == moments[i-1].v {
			note = "nothing to do"
		}
		if i > 0 && m.v != moments[i-1].v && !math.IsNaN(m.v) && !math.IsNaN(moments[i-1].v) {
			change := fmt.Sprintf("× %.9g", m.v/moments[i-1].v)
			if m.step == "blank" || m.step == "offset" {
				change = fmt.Sprintf("%+.9g", m.v-moments[i-1].v)
			}
			note = strings.TrimSuffix(change+"; "+note, "; ")
		}
		if m.why != eem.Measured {
			note = strings.TrimSuffix(m.why.String()+"; "+note, "; ")
		}
		x.add(section, m.step, report.Number(m.v), string(m.unit), note)
	}
	x.add(section, "survey.nc", report.Number(x.sample.Corrected[x.at]), string(x.store.Unit), x.sample.Why[x.at].String())
	return nil
}

// changed tells of raw files that are not what the results were made of.
func (x *explainer) changed() error {
	p, err := outdir.ReadProvenance(x.out)
	if err != nil {
		return err
	}
	was := map[string]string{}
	for _, in := range p.Inputs {
		was[in.Path] = in.SHA256
	}
	for _, f := range x.bottle.Files {
		if h, ok := was[f.Path]; ok && h != f.SHA256 {
			x.add("changed since", f.Path, "", "", "not the file that the results were made of: run again")
		}
	}
	return nil
}
