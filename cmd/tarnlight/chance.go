package main

import (
	"fmt"
	"io"
	"strings"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/report"
)

// chance is a statistical test that was made many times: how often it is wrong where
// nothing is, so that a few findings among many are no surprise.
type chance struct {
	test, method, component string
	of                      string // what was tested, in the plural
	n, found                int
	rate                    float64 // probability that one of them is found by chance
	note                    string
}

func (c chance) expected() float64 { return float64(c.n) * c.rate }

// chartFalse is the share of points of a chart in control that break a rule that
// rejects: 1_3s 0.27 %, 2_2s and R_4s 0.10 % each, 4_1s 0.13 %, 10_x 0.20 % (computed
// for normal values; their sum is the most that all of them give).
const chartFalse = 0.008

// chances lists the tests with a stated rate.
func (j *job) chances() []chance {
	found := map[[3]string]int{}
	for _, f := range j.flags {
		found[[3]string{f.Test, f.Method, f.Component}]++
		if f.Component != "" {
			found[[3]string{f.Test, f.Method, ""}]++
		}
	}
	var out []chance
	add := func(test, method, of string, n int, rate float64, note string) {
		if n > 0 {
			out = append(out, chance{test: test, method: method, of: of, n: n, rate: rate, found: found[[3]string{test, method, ""}], note: note})
		}
	}
	for k, r := range j.res {
		out = append(out, j.detections(k)...)
		method, n := r.Set.Method, j.judge[k].Tested
		tail := distuv.UnitNormal.Survival(j.sv.Limit("structure"))
		add("structure", method, "bottles", n, tail, "Moran's I of noise is normal; held against the "+j.yards[k].String())
		add("unexplained", method, "bottles", n, tail, "at most: the residual must be structured and large besides")
		if j.applied == nil {
			add("unknown", method, "surveys", min(1, j.judge[k].Searched), merit.FalseUnknowns, "found is the number of bottles that show it")
		} else if j.applied.Likeness != nil {
			n := j.count(func(b *prepare.Bottle) bool { return b.Row.Kind == survey.Sample || b.Row.Kind == survey.Spike })
			for _, test := range []string{"unlike-residual", "unlike-scores"} {
				add(test, method, "bottles", n, 0.01, "limit at 99 % of the model's own bottles")
			}
		}
	}
	lines := 0
	for _, l := range j.lines {
		if l.DF > 0 {
			lines++
		}
	}
	add("reference-intercept", "references", "components", lines, 0.05, "at most: Student's t, two-sided")
	add("chart-rule", "", "points", j.ruledPoints(), chartFalse, "at most: the sum of the rules' rates")
	return out
}

// detections are the decisions on the components of resolution k in samples.
func (j *job) detections(k int) []chance {
	var out []chance
	for f, c := range j.res[k].Set.Components {
		v, n, _ := j.detectedValues(k, f)
		if n > 0 {
			out = append(out, chance{test: "detected", method: j.res[k].Set.Method, component: c.Name, of: "bottles", n: n, found: len(v), rate: 0.05,
				note: "at most: as many would be detected if no bottle held any"})
		}
	}
	return out
}

func (j *job) count(pass func(*prepare.Bottle) bool) int {
	n := 0
	for _, b := range j.sv.Bottles {
		if _, ok := j.row[b]; ok && pass(b) {
			n++
		}
	}
	return n
}

// ruledPoints counts the points of charts that rules were applied to.
func (j *job) ruledPoints() int {
	n := 0
	for _, c := range j.charts() {
		for _, r := range c.Judge(int(j.sv.Limit("chart-rule"))) {
			if r.Z == r.Z {
				n++
			}
		}
	}
	return n
}

// testTable makes tests.csv.
func (j *job) testTable() *report.Table {
	t := report.New("tests.csv")
	for _, c := range j.chances() {
		t.Append(c.test, c.method, c.component, c.of, c.n, c.rate, c.expected(), c.found, c.note)
	}
	return t
}

// tellChances says on err what was found by tests over many bottles, beside what
// chance alone would give.
func (j *job) tellChances(w io.Writer) {
	head := false
	for _, c := range j.chances() {
		if c.test == "detected" || c.found == 0 {
			continue
		}
		if !head {
			fmt.Fprintln(w, "tests over many, and what chance alone would give:")
			head = true
		}
		fmt.Fprintf(w, "  %s%s: %d found; by chance %.2g in %s\n", c.test, method(c.method), c.found, c.expected(), eem.Count(c.n, strings.TrimSuffix(c.of, "s")))
	}
	for k, r := range j.res {
		fmt.Fprintf(w, "residuals%s were held against the %s\n", method(r.Set.Method), j.yards[k].String())
	}
}

func method(name string) string {
	if name == "" {
		return ""
	}
	return " (" + name + ")"
}
