package main

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// Hundreds of bottles of which the same is said are one reason with their number and
// the first ids; many of one test that differ in a number are one too, a few are told
// one by one.
func TestReasons(t *testing.T) {
	var flags []eem.Flag
	add := func(id, test string, s eem.Severity, msg string) {
		flags = append(flags, eem.Flag{ID: id, Test: test, Severity: s, Msg: msg})
	}
	for i := range 300 {
		add(fmt.Sprint("W", i), "no-absorbance", eem.Doubt, "no absorbance is given")
		add(fmt.Sprint("W", i), "alert", eem.Doubt, fmt.Sprintf("a is %d", i))
	}
	add("W7", "unreadable", eem.Reject, "is empty")
	add("W8", "unreadable", eem.Reject, "is cut")
	flags = append(flags, eem.Flag{Batch: "B", Test: "no-blank", Severity: eem.Doubt, Msg: "no blank"})
	var got []string
	for _, r := range reasonsOf(flags) {
		got = append(got, r.line())
	}
	want := []string{
		"300 of one kind (W0, W1, W2, W3, W4, W5, W6, W7 and 292 more): no absorbance is given (no-absorbance)",
		"300 of one kind (W0, W1, W2, W3, W4, W5, W6, W7 and 292 more), such as W0: a is 0 (alert)",
		"W7: is empty (unreadable)", "W8: is cut (unreadable)", "batch B: no blank (no-blank)",
	}
	if !slices.Equal(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
}

// Where not one bottle can be used apply writes results that say so of each, with
// exit code 3, and what was there before is whole beside them; a night of blanks
// alone as well.
func TestApplyWithNothingUsable(t *testing.T) {
	testkit.Heavy(t)
	model := kept(t, "parafac.json")
	dir := folder(t, map[string]string{"survey.toml": nightSettings(t, "")})
	night(t, dir, "20310601", map[string]string{"PW1A": "PW1", "W103": "W3"}, nil)
	old(t, dir)
	call("begin", dir, "--add", "--csv").want(t, exitDone)
	call("apply", model, dir, "--pictures=false").want(t, exitDone, exitDoubt)
	before := contents(t, filepath.Join(dir, "out"))
	empty := func(match string) {
		t.Helper()
		files, err := filepath.Glob(filepath.Join(dir, "scans", match, "*"))
		if err != nil || len(files) == 0 {
			t.Fatalf("no files %s: %v", match, err)
		}
		for _, f := range files {
			if err := os.WriteFile(f, nil, 0o644); err != nil {
				t.Fatal(err)
			}
		}
	}
	apply := func(code int, args ...string) (s status, said string) {
		t.Helper()
		r := call(append([]string{"apply", model, dir}, args...)...).want(t, code)
		if err := json.Unmarshal([]byte(read(t, dir, "out", "status.json")), &s); err != nil {
			t.Fatal(err)
		}
		c := table(t, dir, "out", "contributions.csv")
		for i := range c.Rows {
			if q, id := c.Text(i, c.Col("qualifier")), c.Text(i, c.Col("id")); slices.Contains(s.Rejected, id) && q != "R" {
				t.Errorf("%s: qualifier %q", id, q)
			}
		}
		call("verify", filepath.Join(dir, "out")).want(t, exitDone)
		return s, r.err
	}
	empty("20310601_W3")
	if s, _ := apply(exitDoubt, "--pictures=false"); s.Bottles["usable"] != 1 || !slices.Equal(s.Rejected, []string{"W3"}) {
		t.Errorf("blanks alone: %+v", s)
	}
	sameFiles(t, "results before", contents(t, filepath.Join(dir, "out.previous")), before)
	empty("20310601_PW1")
	s, said := apply(exitDoubt) // with pictures
	if s.ExitCode != exitDoubt || s.Outcome != "doubt" || s.Bottles["usable"] != 0 || !slices.Equal(s.Rejected, []string{"PW1", "W3"}) ||
		s.ReasonGroups[len(s.ReasonGroups)-1].Test != "unreadable" {
		t.Errorf("nothing usable: %+v", s)
	}
	if !strings.Contains(said, "not one bottle can be used; the results before these are whole in") {
		t.Errorf("nothing usable: %s", said)
	}
	apply(exitFailed, "--pictures=false", "--strict")
}
