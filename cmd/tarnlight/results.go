package main

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

var nan = math.NaN()

// contributionTable makes contributions.csv: method after method, bottle after
// bottle in the order of the sheet.
func (j *job) contributionTable() *report.Table {
	t := report.New("contributions.csv")
	for _, judged := range j.judge {
		for _, c := range slices.Concat(judged.Contributions, judged.Beyond) {
			t.Append(c.ID, c.Component, c.Method, c.Value, c.Unit, c.U, c.Lower, c.Upper, c.Detection, c.Qualifier,
				c.Critical, c.Quantification, c.Detected, c.Reported, strings.Join(c.Reasons, "; "), c.Model)
		}
	}
	return t
}

// sampleTable makes samples.csv. Columns on the fit speak of the first method.
func (j *job) sampleTable() *report.Table {
	t := report.NewSamples(j.sheet.Columns)
	n := len(j.sheet.Columns)
	place := map[string]int{} // of our columns, from the end of the sheet's
	for _, c := range report.New("samples.csv").Columns {
		place[c] = t.Own(c) - n
	}
	count := map[string]*[4]int{}
	for _, f := range j.flags {
		if count[f.ID] == nil {
			count[f.ID] = &[4]int{}
		}
		count[f.ID][f.Severity]++
	}
	at := 0
	for _, b := range j.sv.Bottles {
		own := make([]any, len(t.Columns)-n)
		set := func(name string, v any) {
			i, ok := place[name]
			if !ok {
				panic("tarnlight: samples.csv has no column " + name)
			}
			own[i] = v
		}
		if !b.Excluded {
			j.fitColumns(set, b, at)
			at++
		}
		set("largest_inner_filter_factor", b.Largest)
		set("linear_from_nm", b.LinearFrom)
		set("over_absorbing_percent", 100*b.OverShare)
		if j.fit != nil {
			if i := slices.Index(j.fit.IDs, b.Row.ID); i >= 0 && j.fit.Leverage != nil {
				set("leverage", j.fit.Leverage[i])
				set("influence", j.fit.Influence[i])
			}
		}
		j.opticsColumns(set, b)
		c := count[b.Row.ID]
		if c == nil {
			c = &[4]int{}
		}
		set("notes", c[eem.Remark])
		set("doubts", c[eem.Doubt])
		set("rejects", c[eem.Reject])
		row := make([]any, 0, len(t.Columns))
		for i := range n {
			cell := ""
			if i < len(b.Row.Cells) {
				cell = b.Row.Cells[i]
			}
			row = append(row, cell)
		}
		t.Append(append(row, own...)...)
	}
	return t
}

// fitColumns tells how the first method explains bottle number at of those that
// are not excluded.
func (j *job) fitColumns(set func(string, any), b *prepare.Bottle, at int) {
	i, ok := j.row[b]
	if !ok || len(j.res) == 0 {
		return
	}
	fit := j.res[0].Fits[i]
	set("fit_method", j.res[0].Set.Method)
	set("cells_used", fit.Cells)
	set("explained_percent", fit.Explained)
	set("residual_rms", fit.RMS)
	set("noise_rms", j.judge[0].Spreads[i].NoiseRMS)
	set("structure", j.judge[0].Structure[at].Z)
	set("hottest_ex_nm", fit.HotEx)
	set("hottest_em_nm", fit.HotEm)
	set("hottest_value", fit.Hot)
	set("condition_number", fit.Condition)
	if !fit.Usable {
		return
	}
	s := &j.judge[0].Spreads[i]
	set("residual_chi_square", s.ChiSquare)
	if z := j.judge[0].Structure[at].Z; z == z { // else nothing is left that could be tested
		set("residual_runs", s.Runs)
	}
	set("residual_yardstick", s.Yard.String())
	set("structure_beyond_yardstick", s.Yard.Score(j.judge[0].Structure[at].Z))
	set("clearest_ex_nm", s.Hot.Ex)
	set("clearest_em_nm", s.Hot.Em)
	set("clearest_value", s.Hot.Height)
	set("clearest_z", s.Hot.Z)
	set("clearest_ex_extent_nm", s.Hot.ExSpan)
	set("clearest_em_extent_nm", s.Hot.EmSpan)
}

// flagTable makes flags.csv.
func (j *job) flagTable() *report.Table {
	t := report.New("flags.csv")
	for _, f := range j.flags {
		var line any
		if f.Line > 0 {
			line = f.Line
		}
		t.Append(f.ID, f.Batch, f.Component, f.Method, f.Test, f.Severity.String(), f.Value, f.Limit, f.Msg, f.File, line)
	}
	return t
}

// componentTable makes components.csv: what the results rest on, then every other
// candidate model.
func (j *job) componentTable() *report.Table {
	t := report.New("components.csv")
	for _, r := range j.res {
		appendSet(t, r.Set, true)
	}
	for _, fit := range j.fits {
		if fit != j.fit {
			appendSet(t, componentsOf(fit), false)
		}
	}
	for _, judged := range j.judge {
		for _, u := range judged.Unknown {
			appendSet(t, &unmix.Set{Grid: u.Set.Grid, Method: merit.MethodUnknown, Components: []unmix.Component{u.Component}}, false)
		}
	}
	return t
}

func appendSet(t *report.Table, s *unmix.Set, chosen bool) {
	for _, c := range s.Components {
		for _, m := range []struct {
			mode string
			ax   eem.Axis
			v, u []float64
			det  []bool
		}{{unmix.ModeEx, s.Grid.Ex, c.Ex, c.ExU, c.ExDetermined}, {unmix.ModeEm, s.Grid.Em, c.Em, c.EmU, c.EmDetermined}} {
			for i, v := range m.v {
				u, det := nan, !math.IsNaN(v)
				if m.u != nil {
					u = m.u[i]
				}
				if m.det != nil {
					det = m.det[i]
				}
				t.Append(c.Name, m.mode, m.ax.At(i), v, u, det, s.Method, s.Len(), chosen, c.AmountUnit)
			}
		}
		if c.AmountUnit != "" {
			t.Append(c.Name, unmix.ModeScale, "", c.Scale, nan, true, s.Method, s.Len(), chosen, c.AmountUnit)
		}
	}
}

// bottle finds a bottle by id, nil when there is none.
func (j *job) bottle(id string) *prepare.Bottle {
	for _, b := range j.sv.Bottles {
		if b.Row.ID == id {
			return b
		}
	}
	return nil
}

// stepTable makes steps.csv: every step of every setup with its parameters. Where
// bottles differ in a parameter the row gives the range, and where it comes from
// several sources all of them.
func (j *job) stepTable() *report.Table {
	t := report.New("steps.csv")
	type key struct{ setup, step, name string }
	type entry struct {
		key
		p       eem.Param
		msg     string
		values  []string
		sources []string
	}
	var order []*entry
	seen := map[key]*entry{}
	for _, b := range j.sv.Bottles {
		if b.EEM == nil {
			continue
		}
		for _, n := range b.EEM.Notes {
			if n.Test != "" {
				continue
			}
			params := n.Params
			if len(params) == 0 {
				params = []eem.Param{{}}
			}
			for _, p := range params {
				k := key{b.Row.Setup, n.Step, p.Name}
				e := seen[k]
				if e == nil {
					e = &entry{key: k, p: p, msg: n.Msg}
					seen[k] = e
					order = append(order, e)
				}
				if n.Msg != e.msg {
					e.msg = ""
				}
				if !slices.Contains(e.values, p.Value) {
					e.values = append(e.values, p.Value)
				}
				if !slices.Contains(e.sources, p.Source) {
					e.sources = append(e.sources, p.Source)
				}
			}
		}
	}
	slices.SortStableFunc(order, func(a, b *entry) int {
		if a.setup != b.setup {
			return strings.Compare(a.setup, b.setup)
		}
		return prepare.StepOrder(a.step) - prepare.StepOrder(b.step)
	})
	for _, e := range order {
		t.Append(prepare.StepOrder(e.step), e.setup, e.step, e.name, summary(e.values), e.p.Unit, strings.Join(e.sources, "; "), e.msg)
	}
	return t
}

// summary gives one value as it is and several as their range, or as a list.
func summary(values []string) string {
	if len(values) == 1 {
		return values[0]
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, s := range values {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			slices.Sort(values)
			return strings.Join(values[:min(len(values), 12)], ", ")
		}
		lo, hi = min(lo, v), max(hi, v)
	}
	return fmt.Sprintf("%s to %s", report.Number(lo), report.Number(hi))
}
