package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// settings-used.toml of a result repeats it: every table and the model come out with
// the same bytes, also where the survey's own settings have changed since, as
// defaults may.
func TestSettingsUsedRepeat(t *testing.T) {
	testkit.Heavy(t)
	dir := demoFolder(t, nil)
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n[scatter]\nrayleigh.first = \"auto\"\n[quality]\nlimit.duplicate = 5\n")
	runNoPictures(t, dir)
	out := filepath.Join(dir, "out")
	used := read(t, out, "settings-used.toml")
	put(t, dir, "used.toml", used)
	put(t, dir, "survey.toml", "[intensity]\nunit = \"counts\"\n")
	runNoPictures(t, dir, "--settings", filepath.Join(dir, "used.toml"), "--out", filepath.Join(dir, "again"))
	files, err := os.ReadDir(out)
	if err != nil {
		t.Fatal(err)
	}
	compared := 0
	for _, f := range files {
		if f.IsDir() || f.Name() == "provenance.json" { // names the settings file
			continue
		}
		compared++
		a, b := read(t, out, f.Name()), read(t, dir, "again", f.Name())
		if f.Name() == "steps.csv" { // a width that was found is a setting the second time
			a = strings.Replace(a, `"ridges of the blanks (scatter.rayleigh.first = ""auto"")"`, "settings", 1)
		}
		if a != b {
			t.Errorf("%s came out otherwise", f.Name())
		}
	}
	if compared < 14 {
		t.Errorf("only %d files were compared", compared)
	}
	call("compare", out, filepath.Join(dir, "again")).want(t, exitDone)
}

// compare lists what changed between two results and what may lie behind it; a
// tolerance lets small differences pass, but no other qualifier.
func TestCompareTellsWhy(t *testing.T) {
	y := newTiny()
	dir := y.write(t)
	runNoPictures(t, dir)
	put(t, dir, "survey.toml", y.settings+"[quality]\nalert = {a = 90}\n")
	put(t, dir, "scans/W1.csv", gridText(1.503, 0.5))
	runNoPictures(t, dir)
	a, b := filepath.Join(dir, "out"), filepath.Join(dir, "out.previous")
	r := call("compare", a, b).want(t, exitDoubt)
	for _, w := range []string{"2 inputs of another content", "scans/W1.csv", `setting quality.alert: {a = 90}, {}`} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in:\n%s", w, r.err)
		}
	}
	if !strings.Contains(r.out, "W1") || strings.Contains(r.out, "W2") {
		t.Errorf("what changed:\n%s", r.out)
	}
	call("compare", a, b, "--tolerance", "0.01").want(t, exitDone)
	text := read(t, a, "contributions.csv")
	_, rest, _ := strings.Cut(text, "\nW2,b,")
	row, _, _ := strings.Cut("W2,b,"+rest, "\n")
	cells := strings.Split(row, ",")
	cells[9] = "J"
	put(t, dir, "other/contributions.csv", strings.Replace(text, row, strings.Join(cells, ","), 1))
	if r := call("compare", a, filepath.Join(dir, "other"), "--tolerance", "1").want(t, exitDoubt); strings.Count(r.out, "\n") != 2 || !strings.Contains(r.out, " J") {
		t.Errorf("another qualifier:\n%s", r.out)
	}
}

// Results that do not lie in their survey folder are verified against the one that
// is named; without it verify says how to name it.
func TestVerifyElsewhere(t *testing.T) {
	dir := newTiny().write(t)
	out := filepath.Join(t.TempDir(), "results")
	runNoPictures(t, dir, "--out", out)
	if r := call("verify", out).want(t, exitDoubt); !strings.Contains(r.out, "inputs gone") || !strings.Contains(r.err, "--survey DIR") {
		t.Errorf("without the survey: %s%s", r.out, r.err)
	}
	if r := call("verify", out, "--survey", dir).want(t, exitDone); !strings.Contains(r.out, "inputs there and equal") || r.err != "" {
		t.Errorf("with it: %s%s", r.out, r.err)
	}
	put(t, dir, "scans/W1.csv", gridText(9, 9))
	if r := call("verify", out, "--survey", dir).want(t, exitDoubt); !strings.Contains(r.out, "scans/W1.csv: input changed") {
		t.Errorf("a changed file: %s%s", r.out, r.err)
	}
	call("verify", out, "--survey", filepath.Join(dir, "nowhere")).want(t, exitFailed)
}
