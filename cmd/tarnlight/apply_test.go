package main

import (
	"math"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// model5 resolves the demo without its spill into five components and returns the
// model file.
func model5(t *testing.T) string {
	t.Helper()
	dir := demoFolder(t, func(rows []string) []string {
		return slices.DeleteFunc(rows, func(r string) bool { return strings.HasPrefix(r, "W310,") })
	})
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n[resolve]\ncomponents = 5\nstarts = 3\n")
	call("resolve", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	return filepath.Join(dir, "out", "model.json")
}

// A bottle scored on a fixed model alone and among 68 others gives the same
// bytes; a spill is unlike the model's bottles and is flagged.
func TestApply(t *testing.T) {
	model := model5(t)
	all := demoFolder(t, nil)
	call("apply", model, all, "--pictures=false").want(t, exitDoubt)
	few := demoFolder(t, func(rows []string) []string {
		out := rows[:1]
		for _, r := range rows[1:] {
			if f := strings.Split(r, ","); f[0] == "W105" || f[1] == "blank" {
				out = append(out, r)
			}
		}
		return out
	})
	call("apply", model, few, "--pictures=false").want(t, exitDone, exitDoubt)
	pick := func(dir string) (rows []string) {
		c := table(t, dir, "out", "contributions.csv")
		for _, r := range c.Rows {
			if r[0] == "W105" {
				rows = append(rows, strings.Join(r, "|"))
			}
		}
		return rows
	}
	one := pick(few)
	if len(one) != 5 {
		t.Fatalf("%d rows of the bottle, want 5", len(one))
	}
	sameRows(t, "alone and among others", one, pick(all))
	flags := table(t, all, "out", "flags.csv")
	if s := cell(t, flags, "severity", "id", "W310", "test", "unlike-residual"); s != "doubt" {
		t.Errorf("the spill: severity %q", s)
	}
	if q := cell(t, table(t, all, "out", "contributions.csv"), "qualifier", "id", "W310", "component", "C1"); q != "J" {
		t.Errorf("the spill: qualifier %q, want J", q)
	}
	r := call("compare", model, filepath.Join(all, "out", "model.json")).want(t, exitDone)
	if n := strings.Count(r.out, "the same"); n != 5 {
		t.Errorf("a model against itself:\n%s", r.out)
	}
}

// What the model's spectra are unsure by is in the budget of a bottle scored on them,
// which is as sure as it was when the model was made; a file of a former version has
// no word of it, and that is told.
func TestApplyBudget(t *testing.T) {
	testkit.Heavy(t)
	model := model5(t)
	dir := demoFolder(t, nil)
	call("apply", model, dir, "--pictures=false").want(t, exitDoubt)
	made, now := filepath.Dir(model), filepath.Join(dir, "out")
	budgetAddsUp(t, table(t, now, "budget.csv"), table(t, now, "contributions.csv"))
	was, is := table(t, made, "contributions.csv"), table(t, now, "contributions.csv")
	for _, c := range []string{"C1", "C2", "C3", "C4", "C5"} {
		load := number(t, cell(t, table(t, now, "budget.csv"), "standard_uncertainty", "id", "W105", "component", c, "cause", "loadings"))
		before := number(t, cell(t, table(t, made, "budget.csv"), "standard_uncertainty", "id", "W105", "component", c, "method", "parafac", "cause", "loadings"))
		if math.Abs(load/before-1) > 0.05 { // the shifts stand for all cells, a bottle lacks some
			t.Errorf("%s: loadings %g, when the model was made %g", c, load, before)
		}
		a, b := number(t, cell(t, was, "standard_uncertainty", "id", "W105", "component", c, "method", "parafac")), number(t, cell(t, is, "standard_uncertainty", "id", "W105", "component", c))
		if math.Abs(b/a-1) > 0.05 {
			t.Errorf("%s: ± %g, when the model was made ± %g", c, b, a)
		}
	}
	old := regexp.MustCompile(`(?s)"spectra_errors": \[.*?\n  \],\n`).ReplaceAllString(read(t, model), "")
	old = regexp.MustCompile(`(?s),\s*"(excitation|emission)_standard_uncertainty": \[.*?\]`).ReplaceAllString(old, "")
	put(t, dir, "old.json", old)
	call("apply", filepath.Join(dir, "old.json"), dir, "--pictures=false").want(t, exitDoubt)
	if s := cell(t, table(t, now, "budget.csv"), "source", "id", "W105", "component", "C1", "cause", "loadings"); s != "not given" {
		t.Errorf("a file of a former version: source of the loadings %q", s)
	}
	cell(t, table(t, now, "flags.csv"), "message", "test", "model-parts")
	put(t, dir, "bad.json", strings.Replace(read(t, model), `"shifts": [`, `"shifts": [ [1],`, 1))
	if r := call("apply", filepath.Join(dir, "bad.json"), dir).want(t, exitFailed); !strings.Contains(r.err, "loadings") {
		t.Errorf("a shift of another length: %s", r.err)
	}
}

// A model does not fit another unit, other corrections, or scans that cover too
// little of a component; the message says what to do.
func TestApplyRefuses(t *testing.T) {
	testkit.Heavy(t)
	model := model5(t)
	y := newTiny()
	dir := y.write(t)
	put(t, dir, "survey.toml", "")
	for _, c := range []struct {
		name, settings, want string
		code                 int
	}{
		{"unit", "[correct]\nblank = \"none\"\n", "Raman units", exitDoubt}, // every bottle is rejected for it
		{"corrections", "[scans]\napplied = [\"intensity\"]\n", "corrected for", exitFailed},
		{"coverage", "[scans]\napplied = [\"intensity\", \"spectral\"]\n", "cover too little of", exitFailed},
	} {
		put(t, dir, "survey.toml", c.settings)
		r := call("apply", model, dir, "--pictures=false").want(t, c.code)
		if !strings.Contains(r.err, c.want) {
			t.Errorf("%s: %s", c.name, r.err)
		}
	}
	put(t, dir, "broken.json", "{\n\"version\": 1,\n")
	r := call("apply", filepath.Join(dir, "broken.json"), dir).want(t, exitFailed)
	if !strings.Contains(r.err, "broken.json:3") {
		t.Errorf("broken model: %s", r.err)
	}
}

// Two results are compared row by row: equal is 0, changed is 3 with the row.
func TestCompareResults(t *testing.T) {
	dir := newTiny().write(t)
	runNoPictures(t, dir)
	runNoPictures(t, dir)
	out := filepath.Join(dir, "out")
	call("compare", out, out+".previous").want(t, exitDone)
	text := read(t, out, "contributions.csv")
	c := table(t, out, "contributions.csv")
	v := cell(t, c, "value", "id", "W1", "component", "a")
	put(t, dir, "other/contributions.csv", strings.Replace(text, "W1,a,references,"+v+",", "W1,a,references,9.99,", 1))
	r := call("compare", out, filepath.Join(dir, "other")).want(t, exitDoubt)
	if !strings.Contains(r.out, "W1") || !strings.Contains(r.out, "9.99") {
		t.Errorf("differences:\n%s", r.out)
	}
	call("compare", out, filepath.Join(out, "contributions.csv")).want(t, exitMisuse)
}
