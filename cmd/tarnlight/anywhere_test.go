package main

import (
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// The whole results folder, pictures, workbook and page included, has the same bytes
// on 1, 2 and 8 workers, in any locale and time zone, whatever the order in which a
// folder lists its files, their times, and the place of the survey.
func TestSameAnywhere(t *testing.T) {
	testkit.Heavy(t)
	files := map[string]string{}
	var names []string
	for f := range synth.Demo(1).Files() {
		files[f.Path] = string(f.Data)
		names = append(names, f.Path)
	}
	rows := strings.Split(strings.TrimSpace(files["runsheet.csv"]), "\n")
	rows = slices.DeleteFunc(rows, func(r string) bool {
		id, _, _ := strings.Cut(r, ",")
		return !slices.Contains([]string{"id", "PW1A", "PW1B", "TRP-1", "TRP-4", "PEA-3", "W102", "W103", "W105", "W107"}, id)
	})
	if len(rows) != 10 {
		t.Fatalf("only %d rows are left: %v", len(rows), rows)
	}
	files["runsheet.csv"] = strings.Join(rows, "\n") + "\n"
	files["survey.toml"] += "\n[resolve]\ncomponents = 2\nstarts = 2\n"
	var first map[string]string
	for i, c := range []struct {
		workers string
		env     []string
		order   func([]string)
	}{
		{"1", []string{"LC_ALL=C", "LANG=C", "TZ=UTC"}, func([]string) {}},
		{"2", []string{"LC_ALL=de_DE.UTF-8", "LANG=de_DE.UTF-8", "TZ=Asia/Kathmandu", "GOMAXPROCS=1"}, slices.Reverse[[]string]},
		{"8", []string{"LC_ALL=tr_TR.UTF-8", "LANG=tr_TR.UTF-8", "TZ=America/St_Johns", "GOMAXPROCS=7", "GOGC=20"},
			func(s []string) {
				rand.New(rand.NewPCG(1, 1)).Shuffle(len(s), func(i, j int) { s[i], s[j] = s[j], s[i] })
			}},
	} {
		dir := filepath.Join(t.TempDir(), strings.Repeat("deep/", i)+"s")
		c.order(names)
		for _, n := range names {
			put(t, dir, n, files[n])
		}
		when := time.Date(2001+10*i, 3, 1, 1, 30, 0, 0, time.UTC)
		if err := os.Chtimes(filepath.Join(dir, "runsheet.csv"), when, when); err != nil {
			t.Fatal(err)
		}
		p := command(t, "run", dir, "--workers", c.workers)
		p.Env = append(p.Env, c.env...)
		p.result(t).want(t, exitDone, exitDoubt)
		now := tree(t, filepath.Join(dir, "out"))
		if first == nil {
			first = now
			continue
		}
		sameTree(t, c.workers+" workers", first, now)
	}
	if len(first) < 25 || first["/model.json"] == "" || first["/report.html"] == "" {
		t.Errorf("only %d files were compared", len(first))
	}
}
