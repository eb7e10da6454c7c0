package main

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/unmix/plan"
)

// isAbsorbance says whether REFERENCES is an absorbance file: a table without a column
// "component" that reads as one.
func (o planOptions) isAbsorbance() (bool, error) {
	if strings.EqualFold(filepath.Ext(o.from), ".json") || isFolder(o.from) {
		return false, nil
	}
	data, err := scanfile.Load(o.from)
	if err != nil {
		return false, err
	}
	if t, err := scanfile.ReadTableBytes(o.from, data); err == nil {
		for _, h := range t.Header {
			if strings.EqualFold(strings.TrimSpace(h), "component") {
				return false, nil
			}
		}
	}
	_, _, err = scanfile.ReadAbsorbanceBytes(o.from, data, nil)
	return err == nil, nil
}

// aloneResult is what plan says of one substance.
type aloneResult struct {
	Absorbance string      `json:"absorbance"`
	Emission   [2]float64  `json:"emission_nm"`
	Maxima     []alonePeak `json:"maxima"`
	Warnings   []string    `json:"warnings"`
}

type alonePeak struct {
	Excitation float64  `json:"excitation_nm"`
	A          float64  `json:"absorbance"`
	X          float64  `json:"natural_absorbance"`
	Excess     float64  `json:"linear_excess_percent"`
	Lost       float64  `json:"window_lost_percent"`
	Bands      []string `json:"bands"`
}

// runAlone finds the excitation maximum of one substance.
func runAlone(s streams, o planOptions) error {
	a, set, err := o.alone()
	if err != nil {
		return err
	}
	peaks := a.Maxima()
	if len(peaks) == 0 {
		return fmt.Errorf("%s: no absorbance above 0 from %g to %g nm; name another range with --excitation", o.from, a.Excitation[0], a.Excitation[1])
	}
	limit := set.Quality.Limit["linear-range"]
	r := aloneResult{Absorbance: o.from, Emission: a.Emission, Warnings: aloneWarnings(a, peaks, limit)}
	t := newText("excitation nm", "absorbance", "ln(10)·A", "linear too high by %", "window lost %", "scatter bands in the window")
	for _, p := range peaks {
		row := alonePeak{p.ExNM, p.A, p.X, 100 * p.Excess, 100 * p.Lost, bandWords(p)}
		r.Maxima = append(r.Maxima, row)
		t.add(fmt.Sprintf("%g", row.Excitation), fmt.Sprintf("%.3g", row.A), fmt.Sprintf("%.3g", row.X), fmt.Sprintf("%.2g", row.Excess), fmt.Sprintf("%.0f", row.Lost), strings.Join(row.Bands, ", "))
	}
	if o.json {
		err = printJSON(s.out, r)
	} else {
		err = t.print(s.out)
		for _, w := range r.Warnings {
			fmt.Fprintln(s.out, w)
		}
	}
	if err == nil && len(r.Warnings) > 0 {
		err = &codeError{code: exitDoubt}
	}
	return err
}

// alone reads the question.
func (o planOptions) alone() (plan.Alone, *survey.Settings, error) {
	var a plan.Alone
	set := survey.Default()
	var err error
	if o.settings != "" {
		if set, err = survey.ReadSettings(o.settings); err != nil {
			return a, nil, err
		}
	}
	abs, _, err := scanfile.ReadAbsorbance(o.from, nil)
	if err != nil {
		return a, nil, err
	}
	abs.PathCM = o.pathCM
	a = plan.Alone{Absorbance: abs.Times(o.times), Excitation: [2]float64{abs.Axis.First(), abs.Axis.Last()}, Bands: prepare.Bands(set.Scatter), PathCM: 1}
	if o.excitation != "" {
		if a.Excitation[0], a.Excitation[1], _, err = span("--excitation", o.excitation, false); err != nil {
			return a, nil, err
		}
	}
	if o.emission == "" {
		return a, nil, misuse("%s is an absorbance file: state the emission window of the scan, --emission FROM:TO, so that scatter in it can be told", o.from)
	}
	a.Emission[0], a.Emission[1], _, err = span("--emission", o.emission, true)
	return a, set, err
}

func bandWords(p plan.Exciting) []string {
	out := []string{}
	for _, b := range p.Taken {
		out = append(out, fmt.Sprintf("%s %.0f–%.0f nm", b.Reason, b.From, b.To))
	}
	return out
}

// worthwhile is the share of the maximum below which another excitation is no remedy.
const worthwhile = 0.2

// aloneWarnings are about the highest maximum.
func aloneWarnings(a plan.Alone, peaks []plan.Exciting, limit float64) []string {
	top, out := peaks[0], []string{}
	if top.Edge {
		out = append(out, fmt.Sprintf("ex %g nm lies at the end of the range: the absorbance may rise beyond it", top.ExNM))
	}
	if len(top.Taken) > 0 {
		w := fmt.Sprintf("at ex %g nm scatter takes %.0f %% of the emission window %g–%g nm (%s)", top.ExNM, 100*top.Lost, a.Emission[0], a.Emission[1], strings.Join(bandWords(top), ", "))
		if c, ok := a.Clear(); ok && c.A >= worthwhile*top.A {
			w += fmt.Sprintf("; the strongest excitation clear of it is %g nm, with %.0f %% of the absorbance", c.ExNM, 100*c.A/top.A)
		} else if from := clearFrom(a, top); from < a.Emission[1] {
			w += fmt.Sprintf("; begin the window at %.0f nm, or leave those cells out", from)
		}
		out = append(out, w)
	}
	if top.X > limit {
		out = append(out, fmt.Sprintf("at ex %g nm ln(10)·A is %.3g, above the linear range of %g (natural base; A = %.3g): emission taken as proportional would be off by %.2g %%; dilute %.2g-fold, or measure the absorbance of every bottle for the inner filter",
			top.ExNM, top.X, limit, top.A, 100*top.Excess, math.Ceil(10*top.X/limit)/10))
	}
	return out
}

// clearFrom is where the first-order bands of an excitation end.
func clearFrom(a plan.Alone, p plan.Exciting) float64 {
	end := a.Emission[0]
	for _, b := range p.Taken {
		if b.Reason == eem.Rayleigh1 || b.Reason == eem.Raman1 {
			end = math.Max(end, b.To)
		}
	}
	return end
}
