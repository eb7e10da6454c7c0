package main

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
	"tarnlight/unmix/report"
)

// resolveDemo resolves the demo and returns its folder.
func resolveDemo(t *testing.T, settings string, change func(rows []string) []string) string {
	t.Helper()
	dir := demoFolder(t, change)
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n[resolve]\nstarts = 2\n"+settings)
	call("resolve", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	return dir
}

// A bottle with exclude_from_fit is corrected, scored and reported, and the
// spectra are those of a survey without it.
func TestExcludeFromFit(t *testing.T) {
	testkit.Heavy(t)
	without := resolveDemo(t, "components = 4\n", func(rows []string) []string {
		var out []string
		for _, r := range rows {
			if !strings.HasPrefix(r, "W310,") {
				out = append(out, r)
			}
		}
		return out
	})
	marked := resolveDemo(t, "components = 4\n", func(rows []string) []string {
		rows[0] += ",exclude_from_fit"
		for i := range rows[1:] {
			rows[i+1] += ","
			if strings.HasPrefix(rows[i+1], "W310,") {
				rows[i+1] += "a spill"
			}
		}
		return rows
	})
	if read(t, without, "out", "components.csv") != read(t, marked, "out", "components.csv") {
		t.Error("a bottle left out of the fit changed the spectra")
	}
	c := table(t, marked, "out", "contributions.csv")
	if v := number(t, cell(t, c, "value", "id", "W310", "component", "C2")); v <= 0 {
		t.Errorf("the bottle was not scored: %g", v)
	}
	cell(t, table(t, marked, "out", "flags.csv"), "message", "id", "W310", "test", "excluded-from-fit")
}

// Names that a user gave in model.json stay over a refit; a component that was
// not there before gets a number that was never used.
func TestNamesStay(t *testing.T) {
	testkit.Heavy(t)
	dir := resolveDemo(t, "components = 3\n", nil)
	path := "out/model.json"
	put(t, dir, path, strings.Replace(read(t, dir, path), `"name": "C2"`, `"name": "sluice glow"`, 1))
	run := func(settings string) *report.Table {
		put(t, dir, "survey.toml", strings.Replace(read(t, dir, "survey.toml"), "components = 3", settings, 1))
		call("resolve", dir, "--pictures=false").want(t, exitDone, exitDoubt)
		return table(t, dir, "out", "contributions.csv")
	}
	names := func(c *report.Table) map[string]bool {
		n := map[string]bool{}
		for r := range c.Rows {
			if c.Text(r, c.Col("method")) == "parafac" {
				n[c.Text(r, c.Col("component"))] = true
			}
		}
		return n
	}
	if n := names(run("components = 3")); len(n) != 3 || !n["sluice glow"] || !n["C1"] || !n["C3"] {
		t.Errorf("after a refit: %v", n)
	}
	n := names(run("components = 4"))
	if len(n) != 4 || n["C2"] || !n["C4"] {
		t.Errorf("after a refit with four: %v", n)
	}
	if msg := cell(t, table(t, dir, "out", "flags.csv"), "message", "test", "components-changed"); !strings.Contains(msg, "new: ") {
		t.Errorf("what became of the former ones: %q", msg)
	}
}

// The choice is a table with verdicts; the analyst's own choice stands beside it
// with the reason.
func TestChoice(t *testing.T) {
	testkit.Heavy(t)
	dir := resolveDemo(t, "components = [3, 5]\n", nil)
	m := table(t, dir, "out", "models.csv")
	if len(m.Rows) != 3 {
		t.Fatalf("%d candidates", len(m.Rows))
	}
	chosen := 0
	for r := range m.Rows {
		if m.Text(r, m.Col("verdict")) == "" || m.Text(r, m.Col("reason")) == "" {
			t.Errorf("row %d has no verdict or reason", r)
		}
		if m.Bool(r, m.Col("chosen")) {
			chosen++
		}
	}
	if chosen != 1 {
		t.Errorf("%d models chosen", chosen)
	}
	s := table(t, dir, "out", "splits.csv")
	if len(s.Rows) == 0 {
		t.Error("no split halves")
	}
	// Every split component has the spectra of both halves, on the grid of
	// components.csv, of maximum 1 (to the digits written).
	h := table(t, dir, "out", "split_spectra.csv")
	points, top := map[string]int{}, map[string]float64{}
	for r := range h.Rows {
		id := strings.Join([]string{h.Text(r, h.Col("components")), h.Text(r, h.Col("split")), h.Text(r, h.Col("half")), h.Text(r, h.Col("component")), h.Text(r, h.Col("mode"))}, "|")
		points[id]++
		if v := h.Float(r, h.Col("loading")); v > top[id] {
			top[id] = v
		}
	}
	if len(points) != 4*len(s.Rows) {
		t.Errorf("%d spectra of halves for %d rows of splits.csv", len(points), len(s.Rows))
	}
	for id, n := range points {
		if n < 5 || math.Abs(top[id]-1) > 1e-4 {
			t.Errorf("%s: %d points, the largest %g", id, n, top[id])
		}
	}
	own := resolveDemo(t, "components = [3, 5]\nchoose = 4\nbecause = \"four stocks were mixed\"\n", nil)
	m = table(t, own, "out", "models.csv")
	if why := cell(t, m, "reason", "components", "4", "chosen", "true"); !strings.Contains(why, "four stocks were mixed") {
		t.Errorf("reason of the analyst's choice: %q", why)
	}
	if len(m.Rows) != 3 {
		t.Errorf("the table was not kept: %d rows", len(m.Rows))
	}
}
