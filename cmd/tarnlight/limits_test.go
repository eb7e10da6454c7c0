package main

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
	"tarnlight/unmix"
)

// The laboratory's own limits decide and are reported; those it leaves out stay
// computed; what cannot be meant is refused with file, line and remedy.
func TestOwnLimits(t *testing.T) {
	testkit.Heavy(t)
	y := newTiny()
	y.files["limits.csv"] = "component,detection_limit,unit\na,0.9,mg/L\nelsewhere,3,mg/L\n"
	y.settings += "[quantify]\nlimits = \"limits.csv\"\n"
	dir := y.write(t)
	call("quantify", dir).want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "contributions.csv")
	w2 := func(column, component string) string { return cell(t, c, column, "id", "W2", "component", component) }
	for column, want := range map[string]string{"detection_limit": "0.9", "critical_value": "0.45", "qualifier": "U", "reported": "< 0.9", "detected": "false"} {
		if got := w2(column, "a"); strings.TrimSuffix(got, "0") != want {
			t.Errorf("a in W2, %s: %q, want %q", column, got, want)
		}
	}
	if v := number(t, w2("value", "a")); math.Abs(v-0.4) > 0.05 {
		t.Errorf("the value was changed: %g", v)
	}
	if l := number(t, w2("detection_limit", "b")); l == 0.9 || w2("detected", "b") != "true" {
		t.Errorf("b has the limit %g", l)
	}
	if p := read(t, dir, "out", "provenance.json"); !strings.Contains(p, "limits.csv") {
		t.Error("the limits file is no input of the provenance")
	}
	for _, bad := range []struct{ file, want string }{
		{"component,limit\na,1\n", "limits.csv:1: a limits file has the columns"},
		{"component,detection_limit\na,none\n", `limits.csv:2: detection_limit "none"; write a number`},
		{"component,detection_limit\na,\n", "limits.csv:2: detection_limit of a is empty"},
		{"component,detection_limit,unit\nb,1,mg/L\na,1,µg/L\n", "limits.csv:3: limits of a in µg/L"},
		{"component,detection_limit\na,1\na,2\n", "limits.csv:3: a stands twice"},
		{"component,detection_limit,critical_value\na,1,2\n", "limits.csv:2: the critical value of a (2) is above"},
	} {
		put(t, dir, "limits.csv", bad.file)
		if r := call("quantify", dir).want(t, exitFailed); !strings.Contains(r.err, bad.want) {
			t.Errorf("%q: %s", bad.file, r.err)
		}
	}
}

// Declaring 2 % for the standards widens every uncertainty against references as the
// root of the squares, and stands in the budget; where the laboratory is silent the
// budget says so. Budgets add up.
func TestDeclaredStandards(t *testing.T) {
	u := map[bool]map[[2]string]unmix.Contribution{}
	for _, declared := range []bool{false, true} {
		d := erring(1, false)
		d.Samples, d.Days = 5, 1
		s := d.Survey()
		if declared {
			s.Settings = "[uncertainty]\nstandards_percent = 2\n"
		}
		j := simulated(t, s, false)
		u[declared] = contributions(j)
		b := j.budgetTable()
		source := cell(t, b, "source", "id", "S001", "component", "pyrene", "cause", "standards")
		if want := map[bool]string{false: "not given", true: "settings: uncertainty"}[declared]; source != want {
			t.Errorf("declared %v: source %q, want %q", declared, source, want)
		}
		budgetAddsUp(t, b, j.contributionTable())
	}
	for k, was := range u[false] {
		is := u[true][k]
		if want := math.Hypot(was.U, 0.02*was.Value); is.Value != was.Value || math.Abs(is.U/want-1) > 1e-9 {
			t.Errorf("%v: %.10g, want %.10g", k, is.U, want)
		}
	}
}
