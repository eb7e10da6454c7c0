package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/testkit"
)

// The demo: every component's median error under 3 %, every planted fault
// flagged, every file of the results there with its header, in under 30 s of
// processor time (which says nothing under the race detector).
func TestDemo(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "demo")
	start, idle := time.Now(), testkit.ProcessorTime(t)
	r := call("demo", dir).want(t, exitDone)
	used := testkit.ProcessorTime(t) - idle
	t.Logf("demo took %v, %v of the processors\n%s%s", time.Since(start).Round(time.Millisecond), used.Round(time.Millisecond), r.out, r.err)
	if !testkit.Race && used > 30*time.Second {
		t.Errorf("took %v, limit 30 s", used)
	}
	lines := strings.Split(strings.TrimSpace(r.out), "\n")
	if len(lines) < 4 {
		t.Fatalf("the table of the demo:\n%s", r.out)
	}
	for _, l := range lines[1:] {
		head, _, _ := strings.Cut(l, "%")
		f := strings.Fields(head)
		if v := number(t, f[len(f)-1]); v >= 3 {
			t.Errorf("median error of 3 %% or more: %s", l)
		}
	}
	if strings.Contains(r.err, "MISSED") {
		t.Error("a planted fault was not found")
	}
	for _, name := range []string{"contributions.csv", "samples.csv", "flags.csv", "components.csv", "models.csv", "splits.csv", "batches.csv",
		"calibration.csv", "charts.csv", "blanks.csv", "budget.csv", "steps.csv", "model.json", "survey.nc", "report.xlsx", "status.json",
		"settings-used.toml", "provenance.json", "maps", "figures"} {
		info, err := os.Stat(filepath.Join(dir, "out", name))
		if err != nil || (!info.IsDir() && info.Size() == 0) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if testkit.Race {
		return // what follows takes as long again and starts nothing new side by side
	}
	// The demo can be run again over itself, and its results verified.
	call("verify", filepath.Join(dir, "out")).want(t, exitDone)
	before := read(t, dir, "out", "contributions.csv")
	call("report", filepath.Join(dir, "out")).want(t, exitDone)
	if read(t, dir, "out", "contributions.csv") != before {
		t.Error("report changed a number")
	}
	call("verify", filepath.Join(dir, "out")).want(t, exitDone)
	call("run", dir, "--settings", filepath.Join(dir, "out", "settings-used.toml"), "--pictures=false").want(t, exitDoubt)
	if read(t, dir, "out", "contributions.csv") != before {
		t.Error("the settings in force do not repeat the result")
	}
}
