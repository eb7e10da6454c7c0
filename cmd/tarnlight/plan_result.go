package main

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix/plan"
	"tarnlight/unmix/report"
)

// planResult is what plan found, as --json prints it.
type planResult struct {
	References string    `json:"references"`
	Grid       string    `json:"grid"`
	Criterion  string    `json:"criterion"`
	Noise      string    `json:"noise"`
	Levels     string    `json:"levels"`
	Plans      []planRow `json:"plans"`
	Full       planRow   `json:"all_scans"`
	Verdict    string    `json:"verdict"`
	Notes      []string  `json:"notes"`

	doubt  bool
	taken  int // number among Plans that the verdict names, −1 none
	design *plan.Design
	in     *planInput
}

// planRow is one plan. What scans cannot tell is null in JSON.
type planRow struct {
	Scans       int             `json:"scans"`
	Excitations []float64       `json:"excitations_nm"`
	Emission    [2]float64      `json:"emission_nm"`
	Points      int             `json:"emission_points"`
	Minutes     float64         `json:"minutes"`
	Percent     *float64        `json:"criterion_percent"`
	AgainstAll  *float64        `json:"against_all_scans"`
	Searched    string          `json:"searched"`
	Components  []planComponent `json:"components"`
	Mixed       []string        `json:"inseparable"`
	Meets       bool            `json:"meets_limits"`

	prediction plan.Prediction
}

// planComponent is what a plan gives of one component.
type planComponent struct {
	Name       string   `json:"component"`
	Unit       string   `json:"unit"`
	Wanted     bool     `json:"wanted"`
	Level      float64  `json:"typical_level"`
	U          *float64 `json:"standard_uncertainty"`
	Percent    *float64 `json:"relative_percent"`
	Detection  *float64 `json:"detection_limit"`
	VIF        *float64 `json:"variance_inflation"`
	AgainstAll *float64 `json:"against_all_scans"`
	Limit      float64  `json:"limit,omitempty"`
}

// result gathers rows and words.
func (in *planInput) result(o planOptions, d *plan.Design, choices []plan.Choice, limits map[string]float64) *planResult {
	r := &planResult{References: in.problem.Set.Origin, Grid: in.problem.Set.Grid.String(), Noise: in.noise, Levels: in.levels, doubt: in.assumed, design: d, in: in,
		Criterion: "root mean square of the relative standard uncertainties", Notes: []string{}}
	if o.worst {
		r.Criterion = "largest relative standard uncertainty"
	}
	all := d.All()
	r.Full = in.row(o, d, all, all, in.problem.Window, limits)
	r.Full.Searched = "all scans"
	for _, c := range choices {
		w, p := in.problem.Window, c.Prediction
		if o.narrow > 0 && !math.IsInf(c.Cost, 1) {
			w, p = d.Narrow(c.Lines, o.narrow/100, o.time)
		}
		row := in.row(o, d, p, all, w, limits)
		row.Searched = "exchange"
		if c.Exhaustive {
			row.Searched = "every choice"
		}
		row.Mixed = in.mixed(d, c.Lines)
		r.Plans = append(r.Plans, row)
	}
	r.judge(limits)
	r.Notes = append(r.Notes, fmt.Sprintf("noise: %s; typical bottle: %s; minutes: %s; what scale, stock solutions and absorbance add is the same for any plan and not in it", in.noise, in.levels, timeWords(o.time)))
	r.Notes = append(r.Notes, in.notes...)
	r.tellRaman()
	r.tellFewer()
	return r
}

// tellFewer says why fewer scans can look better than all of them, and what they hide.
func (r *planResult) tellFewer() {
	for _, p := range r.Plans {
		if p.prediction.Cost < r.Full.prediction.Cost {
			has := "have"
			if p.Scans == 1 {
				has = "has"
			}
			r.Notes = append(r.Notes, fmt.Sprintf("%s %s a smaller predicted uncertainty than all %d: every cell weighs the same in the fit, and dim scans bring more noise than light. "+
				"Yet fewer scans also show less of what the model does not know: run will see less of it and report less of it; keep the full grid for some bottles", eem.Count(p.Scans, "scan"), has, r.Full.Scans))
			return
		}
	}
}

func timeWords(t plan.Timing) string {
	var w []string
	if t.NMPerMinute > 0 {
		w = append(w, fmt.Sprintf("%g nm/min", t.NMPerMinute))
	}
	if t.DwellSeconds > 0 {
		w = append(w, fmt.Sprintf("%g s a point", t.DwellSeconds))
	}
	return strings.Join(append(w, fmt.Sprintf("%g s a scan beside", t.SettleSeconds)), ", ")
}

// row makes the row of one choice.
func (in *planInput) row(o planOptions, d *plan.Design, p, all plan.Prediction, w plan.Window, limits map[string]float64) planRow {
	g := d.Grid()
	from, to, stride := d.Ends(w)
	r := planRow{Scans: len(p.Lines), Points: (to - from + stride - 1) / stride, Emission: [2]float64{g.Em.At(from), g.Em.At(to - 1)},
		Minutes: o.time.Minutes(d, w, len(p.Lines)), Percent: orNull(100 * p.Cost), AgainstAll: orNull(p.Cost / all.Cost), Mixed: []string{}, Meets: true, prediction: p}
	for _, j := range p.Lines {
		r.Excitations = append(r.Excitations, g.Ex.At(j))
	}
	for f, c := range in.problem.Set.Components {
		unit := c.AmountUnit
		if unit == "" {
			unit = string(in.problem.Set.Unit)
		}
		limit := limits[c.Name]
		r.Meets = r.Meets && (limit == 0 || p.Detection[f] <= limit)
		r.Components = append(r.Components, planComponent{Name: c.Name, Unit: unit, Wanted: in.problem.Want[f], Level: in.problem.Level[f], U: orNull(p.U[f]),
			Percent: orNull(100 * p.U[f] / in.problem.Level[f]), Detection: orNull(p.Detection[f]), VIF: orNull(p.VIF[f]), AgainstAll: orNull(p.U[f] / all.U[f]), Limit: limit})
	}
	return r
}

// mixed says what the scans do not tell apart and which scan would.
func (in *planInput) mixed(d *plan.Design, lines []int) []string {
	out := []string{}
	for _, m := range d.Mixed(lines) {
		var names []string
		for _, f := range m.Components {
			names = append(names, in.problem.Set.Components[f].Name)
		}
		var what string
		switch len(names) {
		case 1:
			what = names[0] + " gives no light at these excitations"
		case 2:
			what = fmt.Sprintf("%s and %s stay inseparable (their estimates correlate by %.3f", names[0], names[1], m.Correlation)
			if c := in.problem.Set.Components; c[m.Components[0]].AmountUnit == c[m.Components[1]].AmountUnit {
				what += ", so that run reports their sum"
			}
			what += ")"
		default:
			what = fmt.Sprintf("%s are mixtures of one another", list(names))
		}
		switch {
		case m.Line < 0:
			what += "; no scan of this grid parts them"
		case m.Parted && len(names) == 1:
			what += fmt.Sprintf("; a scan at ex %g nm shows it", d.Grid().Ex.At(m.Line))
		case m.Parted:
			what += fmt.Sprintf("; a scan at ex %g nm beside these would part them", d.Grid().Ex.At(m.Line))
		default:
			what += fmt.Sprintf("; a scan at ex %g nm beside these does most, but it takes more than one", d.Grid().Ex.At(m.Line))
		}
		out = append(out, what)
	}
	return out
}

// enough is how much worse than the best of the plans the suggested one may be.
const enough = 1.25

func numbersText(v []float64) string {
	var s []string
	for _, x := range v {
		s = append(s, report.Number(x))
	}
	return strings.Join(s, " ")
}

// tellRaman reminds of the scan that Raman units rest on.
func (r *planResult) tellRaman() {
	i, set := r.in.setting.Intensity, r.in.problem.Set
	if i.Unit != "raman" && i.Unit != "auto" || set.Unit != "RU" && set.Unit != "" || r.taken >= 0 && slices.Contains(r.Plans[r.taken].Excitations, i.ExcitationNM) {
		return
	}
	note := fmt.Sprintf("Raman units come from the blanks' scan at ex %g nm", i.ExcitationNM)
	if set.Unit == "" {
		note = "the unit of the references is not known; " + note
	}
	if ex := r.Full.Excitations; i.ExcitationNM < ex[0] || i.ExcitationNM > ex[len(ex)-1] { // of those that may be chosen
		note += ", a scan outside this grid: scan the blanks there too"
	} else {
		note += fmt.Sprintf(": scan the blanks there too, or plan it in with --with %g", i.ExcitationNM)
	}
	r.Notes = append(r.Notes, note)
}
