package main

import (
	"math"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// A survey of blanks and standards makes references for later: bottles that are
// scored on its model file have the values, and the uncertainty that the standards
// bring along, which they have when all is measured together.
func TestStandardsAlone(t *testing.T) {
	kind := func(r string) string { return strings.Split(r, ",")[1] }
	without := func(what string) string {
		dir := t.TempDir()
		if err := smallDemo(t).Write(dir); err != nil {
			t.Fatal(err)
		}
		rows := strings.Split(strings.TrimSpace(read(t, dir, "runsheet.csv")), "\n")
		put(t, dir, "runsheet.csv", strings.Join(slices.DeleteFunc(rows, func(r string) bool { return kind(r) == what }), "\n")+"\n")
		return dir
	}
	whole, standards, samples := without("none"), without("sample"), without("standard")
	runNoPictures(t, whole)
	runNoPictures(t, standards)
	call("apply", filepath.Join(standards, "out", "model.json"), samples, "--pictures=false").want(t, exitDone, exitDoubt)
	for _, c := range []struct{ file, column, cause string }{
		{"contributions.csv", "value", ""},
		{"budget.csv", "standard_uncertainty", "noise of the standards"},
		{"budget.csv", "standard_uncertainty", "repeatability of the standards"},
	} {
		where := []string{"id", "W105", "component", "tryptophan"}
		if c.cause != "" {
			where = append(where, "cause", c.cause)
		}
		want := number(t, cell(t, table(t, whole, "out", c.file), c.column, append(where, "method", "references")...))
		got := number(t, cell(t, table(t, samples, "out", c.file), c.column, append(where, "method", "model")...))
		if !(math.Abs(got-want) <= 0.001*want) {
			t.Errorf("%s, %s: %g on the standards' model, %g together", c.file, c.cause, got, want)
		}
	}
}
