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
