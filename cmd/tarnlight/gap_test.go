package main

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// A bottle that lost one excitation file of its ladder is told to lack it, and keeps
// the values that it had to three of its standard uncertainties: what was not
// measured is not made up of the neighbours.
func TestLostExcitation(t *testing.T) {
	dir := t.TempDir()
	if err := smallDemo(t).Write(dir); err != nil {
		t.Fatal(err)
	}
	runNoPictures(t, dir)
	want := rowsByID(t, dir, "contributions.csv")["W109"]
	if err := os.Remove(filepath.Join(dir, "scans", "W109", "W109_ex270.txt")); err != nil {
		t.Fatal(err)
	}
	runNoPictures(t, dir)
	got := rowsByID(t, dir, "contributions.csv")["W109"]
	for i, row := range strings.Split(strings.TrimSpace(got), "\n") {
		g, w := strings.Split(row, "|"), strings.Split(strings.Split(want, "\n")[i], "|")
		if d := math.Abs(number(t, g[3]) - number(t, w[3])); d > 3*number(t, w[5]) {
			t.Errorf("%s: %s ± %s, with all scans %s ± %s", g[1], g[3], g[5], w[3], w[5])
		}
	}
	if m := cell(t, table(t, dir, "out", "flags.csv"), "message", "id", "W109", "test", "grid-part"); !strings.Contains(m, "lacks 1 of 21 excitations") {
		t.Errorf("message: %s", m)
	}
}

// A bottle of which half the stack never came is a doubt, on standard output, in the
// exit code and beside every value; that it is in truth a plan can be stated.
func TestHalfAStack(t *testing.T) {
	dir := t.TempDir()
	if err := smallDemo(t).Write(dir); err != nil {
		t.Fatal(err)
	}
	files, err := filepath.Glob(filepath.Join(dir, "scans", "W109", "W109_ex*.txt"))
	if err != nil || len(files) != 21 {
		t.Fatal(err, len(files))
	}
	for _, f := range files[10:] {
		if err := os.Remove(f); err != nil {
			t.Fatal(err)
		}
	}
	r := call("run", dir, "--pictures=false").want(t, exitDoubt)
	if m := cell(t, table(t, dir, "out", "flags.csv"), "message", "id", "W109", "test", "grid-lost"); !strings.Contains(m, "lacks 11 of 21 excitations") ||
		!strings.Contains(m, "look whether all its files have come") {
		t.Errorf("message: %s\n%s", m, r.err)
	}
	for _, row := range strings.Split(strings.TrimSpace(qualifiers(t, dir, "W109")), "\n") {
		if !strings.Contains(row, "J") && !strings.Contains(row, "U") {
			t.Errorf("unqualified: %s", row)
		}
	}
	if st := read(t, dir, "out", "status.json"); !strings.Contains(st, `"grid-lost": 1`) {
		t.Errorf("status: %s", st)
	}
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n[quality]\nlimit.grid-lost = 100\n")
	call("check", dir).want(t, exitDone, exitDoubt)
	call("run", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	if st := read(t, dir, "out", "status.json"); strings.Contains(st, "grid-lost\": 1") {
		t.Errorf("stated as meant: %s", st)
	}
}

// qualifiers lists component and qualifier of a bottle, one a line.
func qualifiers(t *testing.T, dir, id string) string {
	t.Helper()
	tab := table(t, dir, "out", "contributions.csv")
	out := ""
	for _, r := range tab.Rows {
		if r[tab.Col("id")] == id {
			out += r[tab.Col("component")] + " " + r[tab.Col("qualifier")] + "\n"
		}
	}
	return out
}
