package main

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/report"
)

// batchTable makes batches.csv.
func (j *job) batchTable() *report.Table {
	t := report.New("batches.csv")
	count := map[string]*[4]int{}
	for _, f := range j.flags {
		if count[f.Batch] == nil {
			count[f.Batch] = &[4]int{}
		}
		count[f.Batch][f.Severity]++
	}
	for _, bt := range j.sv.Batches {
		kinds := map[survey.Kind]int{}
		for _, b := range bt.Bottles {
			kinds[b.Row.Kind]++
		}
		var blanks []string
		for _, b := range bt.Blanks {
			blanks = append(blanks, b.Row.ID)
		}
		scale, one := nan, 1.0
		switch j.sv.Unit {
		case eem.Raman:
			scale, one = bt.Raman.Area, bt.Raman.Area
		case eem.Quinine:
			scale, one = bt.Quinine.Slope, bt.Quinine.Slope
		}
		peak, snr := bt.RamanPeak()
		c := count[bt.Name]
		if c == nil {
			c = &[4]int{}
		}
		verdict, reasons := j.verdict(bt)
		t.Append(bt.Name, bt.Setup, bt.Day, kinds[survey.Sample]+kinds[survey.FieldBlank], strings.Join(blanks, " "), kinds[survey.Standard],
			kinds[survey.Control]+kinds[survey.Spike], string(j.sv.Unit), scale, bt.ScaleU(), peak, snr, bt.BlankSpread()/one,
			c[eem.Remark], c[eem.Doubt], c[eem.Reject], verdict, strings.Join(reasons, "; "))
	}
	return t
}

// batchTests are the tests that speak of a batch and not of the water in a bottle.
var batchTests = []string{"batch-rejected", "batch-scale", "control-action", "control-recovery", "spike-recovery", "standard-recovery",
	"duplicate", "field-duplicate", "chart-rule", "lamp-lines"}

// verdict says what a batch is worth: what reading it found, then what its quality
// samples show, one reason a test. A reject on the batch, or a doubt that the
// settings make one, rejects it.
func (j *job) verdict(bt *prepare.Batch) (string, []string) {
	verdict, reasons := bt.Verdict()
	rejecting := j.set.Quality.RejectBatch
	told := map[string]int{}
	var order []string
	first := map[string]eem.Flag{}
	blank := false
	for _, f := range j.flags {
		if f.Batch != bt.Name || f.Severity < eem.Doubt {
			continue
		}
		if f.Test == "field-blank" {
			blank = true
		}
		switch {
		case f.ID == "" && f.Severity == eem.Reject || slices.Contains(rejecting, f.Test):
			verdict = "reject"
		case f.ID != "" && !slices.Contains(batchTests, f.Test):
			continue
		case verdict == "good":
			verdict = "doubt"
		}
		if told[f.Test]++; told[f.Test] == 1 && !slices.ContainsFunc(reasons, func(r string) bool { return strings.Contains(r, f.Msg) }) {
			order, first[f.Test] = append(order, f.Test), f
		}
	}
	for _, test := range order {
		f := first[test]
		more := ""
		if n := told[test] - 1; n > 0 {
			more = fmt.Sprintf(" (and %d more)", n)
		}
		reasons = append(reasons, fmt.Sprintf("%s: %s%s", joined(test, strings.TrimSpace(f.ID+" "+f.Component)), f.Msg, more))
	}
	if blank {
		reasons = append(reasons, "a field blank holds what some of its samples hold little more of")
	}
	if all := j.allDoubted(bt); all != "" {
		reasons = append(reasons, all)
		blank = true
	}
	if verdict == "good" && blank {
		verdict = "doubt"
	}
	return verdict, reasons
}

// allDoubted says so where no sample of a batch has a single result without a doubt;
// such a batch is not good, whatever its blanks and quality samples show.
func (j *job) allDoubted(bt *prepare.Batch) string {
	sample := map[string]bool{}
	for _, b := range bt.Bottles {
		if b.Row.Kind == survey.Sample && !b.Excluded {
			sample[b.Row.ID] = true
		}
	}
	judged := 0
	for _, m := range j.judge {
		for _, c := range m.Contributions {
			if !sample[c.ID] {
				continue
			}
			if len(c.Reasons) == 0 && c.Qualifier != unmix.NotUsable {
				return ""
			}
			judged++
		}
	}
	if judged == 0 || len(sample) < 2 { // a single sample's own doubt says it
		return ""
	}
	return fmt.Sprintf("not one of the %d samples has a result without a doubt", len(sample))
}

// joined puts a comma between what is not empty.
func joined(a, b string) string {
	if b == "" {
		return a
	}
	return a + ", " + b
}

// charts lists every quality variable: those of the blanks, recoveries of controls
// and spikes, differences of duplicates.
func (j *job) charts() []prepare.Chart {
	out := j.sv.Charts()
	for _, c := range []struct {
		kind survey.Kind
		name string
	}{{survey.Control, "recovery of a control"}, {survey.Spike, "recovery of a spike"}} {
		for _, component := range j.componentNames("references") {
			chart := prepare.Chart{Variable: c.name + ", " + component, Unit: "%"}
			for _, g := range j.givens() {
				if g.bottle.Row.Kind == c.kind && g.component == component && g.given > 0 {
					chart.Points = append(chart.Points, prepare.ChartPoint{Batch: g.bottle.Batch, ID: g.bottle.Row.ID, Measured: g.bottle.Row.Measured.Text,
						Value: g.recovery(), Centre: 100, Low: 100 - g.limit, High: 100 + g.limit})
				}
			}
			out = append(out, chart)
		}
	}
	return slices.DeleteFunc(append(out, j.duplicateCharts()...), func(c prepare.Chart) bool { return len(c.Points) == 0 })
}

// duplicateCharts are the differences of duplicates, field and laboratory apart,
// one chart a method and component.
func (j *job) duplicateCharts() []prepare.Chart {
	var out []prepare.Chart
	at := map[[3]string]int{}
	for _, d := range j.allDuplicates() {
		key := [3]string{d.test, d.method, d.component}
		k, ok := at[key]
		if !ok {
			kind := map[string]string{"duplicate": "laboratory", "field-duplicate": "field"}[d.test]
			k = len(out)
			at[key] = k
			out = append(out, prepare.Chart{Variable: fmt.Sprintf("difference of %s duplicates, %s, %s", kind, d.method, d.component), Unit: "%", OneSided: true})
		}
		out[k].Points = append(out[k].Points, prepare.ChartPoint{Batch: d.bottle.Batch, ID: d.bottle.Row.ID, Measured: d.bottle.Row.Measured.Text,
			Value: d.rpd, Centre: 0, Low: nan, High: d.limit})
	}
	return out
}

func (j *job) componentNames(method string) []string {
	for _, r := range j.res {
		if r.Set.Method == method {
			return r.Set.Names()
		}
	}
	return nil
}

// chartTable makes charts.csv.
func (j *job) chartTable() *report.Table {
	t := report.New("charts.csv")
	fewest := int(j.sv.Limit("chart-rule"))
	for _, c := range j.charts() {
		for _, r := range c.Judge(fewest) {
			verdict := "pass"
			if r.Broken {
				verdict = "doubt"
			}
			t.Append(c.Variable, r.Batch, r.ID, r.Measured, r.Value, c.Unit, r.Centre, r.WarnLow, r.WarnHigh, r.Low, r.High, verdict, strings.Join(r.Rules, ", "))
		}
	}
	return t
}

// chartFlags tells which points break a rule of their chart. Plain limits have
// tests of their own.
func (j *job) chartFlags() []eem.Flag {
	var out []eem.Flag
	fewest := j.sv.Limit("chart-rule")
	for _, c := range j.charts() {
		for _, r := range c.Judge(int(fewest)) {
			if !r.Broken || math.IsNaN(r.Z) {
				continue
			}
			id := r.ID
			if j.bottle(id) == nil {
				id = ""
			}
			out = append(out, j.sv.Accept(eem.Flag{ID: id, Batch: r.Batch, Test: "chart-rule", Severity: eem.Doubt, Value: r.Z, Limit: fewest,
				Msg: fmt.Sprintf("%s: %s %s is %+.1f standard deviations off the centre (%s, %d points); look for what changed before using the batch", c.Variable, inFull(r.Value, 5), c.Unit, r.Z, strings.Join(r.Rules, ", "), len(c.Points))}))
		}
	}
	return out
}

// blankTable makes blanks.csv.
func (j *job) blankTable() *report.Table {
	t := report.New("blanks.csv")
	limit := j.sv.Limit("blank-level")
	for _, bt := range j.sv.Batches {
		for _, b := range bt.Blanks {
			if b.Glow == nil {
				continue
			}
			for _, s := range []struct {
				mode   string
				at     float64
				points []prepare.GlowPoint
			}{{unmix.ModeEx, b.Glow.EmNM, b.Glow.Excitation}, {unmix.ModeEm, b.Glow.ExNM, b.Glow.Emission}} {
				for _, p := range s.points {
					t.Append(bt.Name, b.Row.ID, s.mode, s.at, p.NM, p.Percent, p.Others, b.Glow.Percent > limit)
				}
			}
		}
	}
	return t
}
