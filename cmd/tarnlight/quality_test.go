package main

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/survey"
	"tarnlight/unmix"
)

// watched is tiny with the columns that quality samples need.
func watched() *tiny {
	y := newTiny()
	y.sheet[0] += ",replicate_of,replicate_kind,spike_of,batch"
	for i := range y.sheet[1:] {
		y.sheet[i+1] += ",,,,one"
	}
	return y
}

// watch adds a bottle with its last four cells.
func (y *tiny) watch(id, kind string, a, b float64, conc, last string) {
	y.add(id, kind, a, b, conc)
	y.sheet[len(y.sheet)-1] += "," + last
}

// Controls, spikes, standards, duplicates and field blanks that are off are
// flagged with their codes, those that are right are not, and the batch says why
// it is in doubt.
func TestQualitySamples(t *testing.T) {
	for _, c := range []struct {
		name string
		add  func(y *tiny)
		flag string // "id test", empty: none
	}{
		{"all right", func(y *tiny) {
			y.watch("C1", "control", 1.5, 1, "1.5,1", ",,,one")
			y.watch("W1R", "sample", 1.55, 0.51, "", "W1,laboratory,,one")
			y.watch("W1F", "sample", 1.85, 0.62, "", "W1,field,,one")
			y.watch("W1S", "spike", 2.5, 0.5, "1,", ",,W1,one")
			y.watch("FB", "field-blank", 0, 0, "", ",,,one")
		}, ""},
		{"control", func(y *tiny) { y.watch("C1", "control", 1.8, 1, "1.5,1", ",,,one") }, "C1 control-recovery"},
		{"spike", func(y *tiny) { y.watch("W1S", "spike", 2.2, 0.5, "1,", ",,W1,one") }, "W1S spike-recovery"},
		{"standard", func(y *tiny) { y.watch("A3", "standard", 1.1, 0, "1.5,", ",,,one") }, "A3 standard-recovery"},
		{"laboratory duplicate", func(y *tiny) { y.watch("W1R", "sample", 1.9, 0.5, "", "W1,laboratory,,one") }, "W1R duplicate"},
		{"field duplicate", func(y *tiny) { y.watch("W1F", "sample", 2.3, 0.5, "", "W1,field,,one") }, "W1F field-duplicate"},
		{"field blank", func(y *tiny) { y.watch("FB", "field-blank", 0.12, 0, "", ",,,one") }, "W2 field-blank"},
	} {
		t.Run(c.name, func(t *testing.T) {
			y := watched()
			c.add(y)
			dir := y.write(t)
			call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
			flags := table(t, dir, "out", "flags.csv")
			got := map[string]int{}
			for _, row := range flags.Rows {
				if row[flags.Col("severity")] != "note" {
					got[row[flags.Col("id")]+" "+row[flags.Col("test")]]++
				}
			}
			batches := table(t, dir, "out", "batches.csv")
			verdict, reason := batches.Rows[0][batches.Col("verdict")], batches.Rows[0][batches.Col("reason")]
			watch := []string{"control-recovery", "spike-recovery", "standard-recovery", "duplicate", "field-duplicate", "field-blank"}
			for k := range got {
				for _, test := range watch {
					if strings.HasSuffix(k, " "+test) && k != c.flag {
						t.Errorf("flagged: %s", k)
					}
				}
			}
			if c.flag == "" {
				if verdict != "good" {
					t.Errorf("verdict %q: %s", verdict, reason)
				}
				return
			}
			if got[c.flag] == 0 {
				t.Errorf("%s is not flagged: %v", c.flag, got)
			}
			if verdict != "doubt" || reason == "" {
				t.Errorf("verdict %q: %s", verdict, reason)
			}
		})
	}
}

// A quality sample that is off makes the values that it speaks of unreliable, and
// no others (rules of concerns).
func TestQualityReaches(t *testing.T) {
	for _, c := range []struct {
		name string
		add  func(y *tiny)
		want string // "id component" of every J, sorted
	}{
		{"control", func(y *tiny) { y.watch("C1", "control", 1.75, 1, "1.5,1", ",,,one") }, "C1 a,W1 a,W2 a"},
		{"spike", func(y *tiny) { y.watch("W1S", "spike", 2.2, 0.5, "1,", ",,W1,one") }, "W1 a,W1S a"},
		{"duplicate", func(y *tiny) { y.watch("W1R", "sample", 1.9, 0.5, "", "W1,laboratory,,one") }, "W1 a,W1R a"},
		{"field blank", func(y *tiny) { y.watch("FB", "field-blank", 0.12, 0, "", ",,,one") }, "W2 a"},
	} {
		y := watched()
		c.add(y)
		dir := y.write(t)
		call("quantify", dir, "--pictures=false").want(t, exitDoubt)
		if got := unreliable(t, dir); got != c.want {
			t.Errorf("%s: unreliable are %q, want %q", c.name, got, c.want)
		}
	}
}

// unreliable lists "id component" of every J that is no standard's, sorted.
func unreliable(t *testing.T, dir string) string {
	t.Helper()
	tab := table(t, dir, "out", "contributions.csv")
	var out []string
	for _, r := range tab.Rows {
		if r[tab.Col("qualifier")] == "J" && r[tab.Col("reasons")] == "" {
			t.Errorf("%v has no reason", r)
		}
		if r[tab.Col("qualifier")] == "J" {
			out = append(out, r[0]+" "+r[1])
		}
	}
	slices.Sort(out)
	return strings.Join(out, ",")
}

// A control beyond its action limit rejects its batch, and so does a test that the
// settings name; a reject on the batch rejects no bottle.
func TestBatchRejected(t *testing.T) {
	for _, c := range []struct {
		name, settings, verdict, reason string
		found                           float64 // of 1.5 given
	}{
		{"in doubt", "", "doubt", "control-recovery", 1.75},
		{"beyond action", "", "reject", "control-action", 1.95},
		{"limit set", "[quality]\nlimit = {control-action = 15}\n", "reject", "control-action", 1.75},
		{"test named", "[quality]\nreject_batch = [\"control-recovery\"]\n", "reject", "control-recovery", 1.75},
	} {
		y := watched()
		y.watch("C1", "control", c.found, 1, "1.5,1", ",,,one")
		dir := y.write(t)
		put(t, dir, "survey.toml", read(t, dir, "survey.toml")+c.settings)
		call("quantify", dir, "--pictures=false").want(t, exitDoubt)
		b := table(t, dir, "out", "batches.csv")
		if v, why := b.Rows[0][b.Col("verdict")], b.Rows[0][b.Col("reason")]; v != c.verdict || !strings.Contains(why, c.reason) {
			t.Errorf("%s: verdict %q: %s", c.name, v, why)
		}
		if s := read(t, dir, "out", "status.json"); !strings.Contains(s, `"rejected": []`) {
			t.Errorf("%s: a bottle is rejected: %s", c.name, s)
		}
	}
}

// SEC-9.1-rpd (formula): 9 and 11 differ by 20 %.
func TestRelativeDifference(t *testing.T) {
	if got := rpd(9, 11); math.Abs(got-20) > 1e-12 {
		t.Errorf("%g %%, want 20 %%", got)
	}
}

// Amounts without a unit are told, and stand in a unit that says so; cells below the
// excitation that no step cut out are told once.
func TestToldOfSheetAndScatter(t *testing.T) {
	y := newTiny()
	y.sheet[0] = strings.Replace(y.sheet[0], "conc:a [mg/L]", "conc:a", 1)
	dir := y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	if u := cell(t, table(t, dir, "out", "contributions.csv"), "unit", "id", "W1", "component", "a"); u != unmix.UnitUnstated {
		t.Errorf("unit %q", u)
	}
	if msg := cell(t, table(t, dir, "out", "flags.csv"), "message", "test", "conc-unit"); !strings.Contains(msg, "conc:a [unit]") {
		t.Error(msg)
	}
	dir = demoFolder(t, func(rows []string) []string {
		return slices.DeleteFunc(rows, func(r string) bool { return strings.HasPrefix(r, "W2") || strings.HasPrefix(r, "W3") })
	})
	put(t, dir, "survey.toml", strings.Replace(read(t, dir, "survey.toml"), "[correct]\n", "[correct]\noff = [\"scatter\"]\n", 1))
	r := call("check", dir)
	if n := strings.Count(r.out+r.err, "emission shorter than the excitation"); n != 1 {
		t.Errorf("told %d times:\n%s%s", n, r.out, r.err)
	}
}

// The kinds of duplicates have charts of their own, and recoveries their limits.
func TestCharts(t *testing.T) {
	y := watched()
	y.watch("C1", "control", 1.5, 1, "1.5,1", ",,,one")
	y.watch("W1R", "sample", 1.55, 0.51, "", "W1,laboratory,,one")
	y.watch("W1F", "sample", 1.85, 0.62, "", "W1,field,,one")
	dir := y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "charts.csv")
	for variable, high := range map[string]string{"recovery of a control, a": "110", "difference of laboratory duplicates, references, a": "20",
		"difference of field duplicates, references, a": "30"} {
		if got := cell(t, c, "act_high", "variable", variable); got != high {
			t.Errorf("%s: action limit %s, want %s", variable, got, high)
		}
		if got := cell(t, c, "verdict", "variable", variable); got != "pass" {
			t.Errorf("%s: %s", variable, got)
		}
	}
	v := number(t, cell(t, c, "value", "variable", "difference of laboratory duplicates, references, a"))
	if want := 200 * 0.05 / 3.05; math.Abs(v-want) > 0.3 {
		t.Errorf("relative difference %g %%, want about %g %%", v, want)
	}
}

// With twenty points and more the chart's own limits hold, and its rules.
func TestChartRules(t *testing.T) {
	y := watched()
	for n := range 25 {
		f := 1 + 0.004*float64(n%5-2)
		if n == 24 {
			f = 1.06 // within the plain limit of 10 %, far beyond 3 s
		}
		y.watch(fmt.Sprintf("C%d", n), "control", 1.5*f, 1, "1.5,1", ",,,one")
	}
	dir := y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDoubt)
	flags := table(t, dir, "out", "flags.csv")
	if msg := cell(t, flags, "message", "id", "C24", "test", "chart-rule"); !strings.Contains(msg, "1_3s") {
		t.Error(msg)
	}
	n := 0
	for _, row := range flags.Rows {
		if row[flags.Col("test")] == "chart-rule" {
			n++
		}
	}
	if n != 1 {
		t.Errorf("%d points are flagged, want the last one", n)
	}
	if batches := table(t, dir, "out", "batches.csv"); !strings.Contains(batches.Rows[0][batches.Col("reason")], "chart-rule") {
		t.Error(batches.Rows[0])
	}
}

// Where standards leave their line is found from the levels below; noise of a few
// percent is no departure.
func TestLeavesLine(t *testing.T) {
	line := func(found ...float64) []unmix.Point {
		var ps []unmix.Point
		for i, f := range found {
			ps = append(ps, unmix.Point{Given: float64(2 * (i + 1)), Found: f})
		}
		return ps
	}
	for _, c := range []struct {
		ps   []unmix.Point
		at   float64
		left bool
	}{
		{line(2, 4, 6, 8), 0, false},
		{line(2.05, 3.95, 6.1, 7.9), 0, false},
		{line(2, 4, 5, 6), 6, true},
		{line(2, 4, 6, 6.9), 8, true},
		{line(2, 4, 5, 8), 0, false}, // one level off, the line goes on
		{line(2, 3), 0, false},
	} {
		at, _, left := leavesLine(c.ps, 10)
		if left != c.left || (left && at != c.at) {
			t.Errorf("%v: %v at %g, want %v at %g", c.ps, left, at, c.left, c.at)
		}
	}
}

// The kinds of replicates are the words that the sheet takes.
func TestReplicateKind(t *testing.T) {
	y := watched()
	y.watch("W1R", "sample", 1.5, 0.5, "", "W1,sometimes,,one")
	r := call("check", y.write(t))
	if r.code != exitFailed || !strings.Contains(r.err+r.out, survey.Field) {
		t.Errorf("exit %d: %s%s", r.code, r.out, r.err)
	}
}
