package main

import (
	"fmt"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// begin on the demo's raw files alone, with nothing but their names and content:
// the draft is accepted by check and run, ids, kinds and absorbance files are
// those of the sheet that was taken away, and nothing that is there is touched.
func TestBeginDrafts(t *testing.T) {
	testkit.Heavy(t)
	for _, asCSV := range []bool{false, true} {
		dir := t.TempDir()
		if err := synth.Demo(1).Write(dir); err != nil {
			t.Fatal(err)
		}
		want := table(t, dir, "runsheet.csv")
		raw := t.TempDir()
		copyTree(t, filepath.Join(dir, "scans"), filepath.Join(raw, "scans"))
		copyTree(t, filepath.Join(dir, "absorbance"), filepath.Join(raw, "absorbance"))
		args := []string{"begin", raw}
		name := "runsheet.xlsx"
		if asCSV {
			args, name = append(args, "--csv"), "runsheet.csv"
		}
		r := call(args...).want(t, exitDone)
		for i := range want.Rows {
			id := want.Text(i, want.Col("id"))
			if !strings.Contains(r.out, id+" ") {
				t.Errorf("%s is not drafted", id)
			}
		}
		before := read(t, raw, name)
		if again := call(args...).want(t, exitFailed); !strings.Contains(again.err, "not touched") {
			t.Errorf("a second begin: %s", again.err)
		}
		if read(t, raw, name) != before {
			t.Error("the sheet was touched")
		}
		call("check", raw).want(t, exitDone, exitDoubt)
		if !asCSV {
			continue
		}
		got := table(t, raw, "runsheet.csv")
		if len(got.Rows) != len(want.Rows) {
			t.Errorf("%d rows drafted, the sheet has %d", len(got.Rows), len(want.Rows))
		}
		for i := range want.Rows {
			id := want.Text(i, want.Col("id"))
			if a, b := cell(t, got, "absorbance", "id", id), want.Text(i, want.Col("absorbance")); a != b {
				t.Errorf("%s: absorbance %q, the sheet says %q", id, a, b)
			}
			// PW and FB are the laboratory's own letters; no word in a name tells a blank there.
			if k := cell(t, got, "kind", "id", id); k != "sample" {
				t.Errorf("%s: kind %q", id, k)
			}
		}
		put(t, raw, "survey.toml", "[resolve]\ncomponents = 3\nstarts = 2\n[correct]\ninner_filter = \"none\"\n")
		runNoPictures(t, raw)
	}
}

func copyTree(t *testing.T, from, to string) {
	t.Helper()
	files, err := filepath.Glob(filepath.Join(from, "*"))
	if err != nil {
		t.Fatal(err)
	}
	more, err := filepath.Glob(filepath.Join(from, "*", "*"))
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range append(files, more...) {
		if filepath.Ext(f) == "" {
			continue
		}
		rel, err := filepath.Rel(from, f)
		if err != nil {
			t.Fatal(err)
		}
		put(t, to, filepath.ToSlash(rel), read(t, f))
	}
}

// Names as people give them: blanks told by their word, single scans of one folder
// grouped by what stands before the excitation, equal names in two folders kept
// apart, marks that a spreadsheet would take for a formula left out.
func TestBeginNames(t *testing.T) {
	dir := t.TempDir()
	for _, n := range []string{"day 1/Blank A.csv", "day 1/field blank.csv", "day 1/Mühle 3.csv", "day 2/Mühle 3.csv", "=odd.csv"} {
		put(t, dir, n, gridText(1, 1))
	}
	for _, stem := range []string{"R1", "R10"} {
		for j, ex := range tinyEx {
			var b strings.Builder
			for k, em := range tinyEm {
				fmt.Fprintf(&b, "%g\t%.3f\n", em, tinyCell(1, 2, j, k))
			}
			put(t, dir, fmt.Sprintf("stack/%s_ex%g.txt", stem, ex), b.String())
		}
	}
	put(t, dir, "notes.txt", "measured on a rainy day\n")
	r := call("begin", dir, "--csv").want(t, exitDone)
	sheet := table(t, dir, "runsheet.csv")
	for id, kind := range map[string]string{"Blank A": "blank", "field blank": "field-blank", "R1": "sample", "R10": "sample",
		"day 1-Mühle 3": "sample", "day 2-Mühle 3": "sample", "odd": "sample"} {
		if k := cell(t, sheet, "kind", "id", id); k != kind {
			t.Errorf("%s: %q, want %q", id, k, kind)
		}
	}
	if !strings.Contains(r.err, "not used: notes.txt") {
		t.Errorf("a file that is no scan: %s", r.err)
	}
	call("check", dir).want(t, exitDone, exitDoubt)
}
