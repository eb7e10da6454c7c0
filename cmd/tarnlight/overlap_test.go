package main

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
	"tarnlight/unmix/report"
)

// pairSurvey has a third component c, whose spectrum is that of a but a tenth higher
// at the shortest emission, and a sample with noise.
func pairSurvey() *tiny {
	y := newTiny()
	y.sheet[0] += ",conc:c [mg/L]"
	for i := range y.sheet[1:] {
		y.sheet[i+1] += ","
	}
	for n, id := range []string{"C1", "C2"} {
		amount := float64(n + 1)
		y.add(id, "standard", amount, 0, fmt.Sprintf(",,%g", amount))
		y.files["scans/"+id+".csv"] = changed(gridText(amount, 0), func(j, k int) float64 {
			if k > 0 {
				return 0
			}
			return 0.1 * (tinyCell(amount, 0, j, k) - tinyCell(0, 0, j, k))
		})
	}
	y.files["scans/W1.csv"] = changed(y.files["scans/W1.csv"], func(j, k int) float64 { return 2 * math.Sin(float64(17*j+29*k)) })
	return y
}

// changed adds to the cells of a scan file.
func changed(text string, by func(j, k int) float64) string {
	lines := strings.Split(strings.TrimSpace(text), "\n")
	for k, line := range lines[1:] {
		f := strings.Split(line, ",")
		for j, cell := range f[1:] {
			v, err := strconv.ParseFloat(cell, 64)
			if err != nil {
				panic(err)
			}
			f[j+1] = fmt.Sprintf("%.4f", v+by(j, k))
		}
		lines[k+1] = strings.Join(f, ",")
	}
	return strings.Join(lines, "\n") + "\n"
}

// Two components that cannot be told apart are reported as their sum, with the
// reason and without a doubt of its own; each of the two points to it. Accepting the
// overlap with a reason is how to ask for both apart.
func TestPairsAsSum(t *testing.T) {
	y := pairSurvey()
	dir := y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDoubt)
	c := table(t, dir, "out", "contributions.csv")
	of := func(column, component string) string { return cell(t, c, column, "id", "W1", "component", component) }
	width := func(component string) float64 {
		return number(t, of("upper95", component)) - number(t, of("lower95", component))
	}
	if sum := number(t, of("value", "a + c")); math.Abs(sum-1.5) > 0.02 || of("detected", "a + c") != "true" || width("a + c") > width("a")/3 {
		t.Errorf("the sum: %g; its interval is %g wide, that of a alone %g", sum, width("a + c"), width("a"))
	}
	for _, single := range []string{"a", "c"} {
		if q := of("qualifier", single); (q != "J" || of("reported", single) != "see a + c") && q != "U" {
			t.Errorf("%s: qualifier %q, reported %q", single, q, of("reported", single))
		}
		if !strings.Contains(of("reasons", single), "cannot be told apart") {
			t.Errorf("%s: reasons %q", single, of("reasons", single))
		}
	}
	if m := cell(t, table(t, dir, "out", "flags.csv"), "message", "test", "overlap", "component", "a + c"); !strings.Contains(m, "their sum is reported") || !strings.Contains(m, "accept") {
		t.Errorf("the flag: %q", m)
	}
	y.settings += "[quality]\naccept = { overlap = \"both are wanted\" }\n"
	dir = y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	c = table(t, dir, "out", "contributions.csv")
	if slices.ContainsFunc(c.Rows, func(r []string) bool { return strings.Contains(r[c.Col("component")], "+") }) {
		t.Error("accepted, and still a sum")
	}
	if of("reported", "a") == "see a + c" || strings.Contains(of("reasons", "a"), "told apart") {
		t.Errorf("accepted, and still %q: %s", of("reported", "a"), of("reasons", "a"))
	}
}

// A library that lacks what a sample mostly holds: the alarm marks its contributions
// unreliable and says why; with the whole library there is none.
func TestWrongLibrary(t *testing.T) {
	testkit.Heavy(t)
	alarms := func(c *report.Table) (doubted, detected int) {
		for _, r := range c.Rows {
			col := func(name string) string { return r[c.Col(name)] }
			if !strings.HasPrefix(col("id"), "S") || col("detected") != "true" || col("method") != "references" {
				continue
			}
			detected++
			if strings.Contains(col("reasons"), "is not in the model") {
				doubted++
				if col("qualifier") != "J" {
					t.Errorf("%s, %s: %q although %s", col("id"), col("component"), col("qualifier"), col("reasons"))
				}
			}
		}
		return doubted, detected
	}
	for _, whole := range []bool{true, false} {
		d := erring(3, false)
		d.Samples, d.Days, d.Absent = 8, 1, 0
		s := d.Survey()
		if !whole { // as if nobody had heard of the strongest, the peat extract
			of := slices.IndexFunc(s.Components, func(f *synth.Fluorophore) bool { return f.Name == "peat extract" })
			s.Components = slices.Delete(s.Components, of, of+1)
			s.Bottles = slices.DeleteFunc(s.Bottles, func(b synth.Bottle) bool { return b.Kind == "standard" && b.Known[0].Of.Name == "peat extract" })
		}
		dir := t.TempDir()
		if err := s.Write(dir); err != nil {
			t.Fatal(err)
		}
		call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
		doubted, detected := alarms(table(t, dir, "out", "contributions.csv"))
		t.Logf("whole library %v: %d of %d contributions doubted", whole, doubted, detected)
		if whole && doubted > 0 || !whole && doubted < detected/2 || detected == 0 {
			t.Errorf("whole library %v: %d of %d contributions doubted", whole, doubted, detected)
		}
	}
}
