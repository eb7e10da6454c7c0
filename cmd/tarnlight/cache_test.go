package main

import (
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// smallDemo is the first day of the invented survey on a coarse grid: blanks, a
// field blank, a control, standards and samples, 23 bottles in three forms of files.
func smallDemo(t testing.TB) *synth.Survey {
	t.Helper()
	sv := synth.Demo(1)
	sv.Bottles = slices.DeleteFunc(sv.Bottles, func(b synth.Bottle) bool { return b.Measured.Day() != 6 })
	in := *sv.Instrument
	sv.Instrument = &in
	var errs [2]error
	in.Ex, errs[0] = eem.Steps(250, 450, 10)
	in.Em, errs[1] = eem.Steps(280, 600, 5)
	for _, err := range errs {
		if err != nil {
			t.Fatal(err)
		}
	}
	for i := range sv.Bottles {
		switch sv.Bottles[i].ID {
		case "W103", "W105", "W107":
			sv.Bottles[i].Layout = synth.Layout{Form: synth.Long, Delimiter: ";", DecimalComma: true}
		}
	}
	return sv
}

// contents reads every file below a folder.
func contents(t testing.TB, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	err := filepath.WalkDir(dir, func(p string, d fs.DirEntry, err error) error {
		if err == nil && d.Type().IsRegular() {
			out[strings.TrimPrefix(p, dir)] = read(t, p)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// sameFiles tells which files differ.
func sameFiles(t *testing.T, what string, got, want map[string]string) {
	t.Helper()
	if len(got) != len(want) {
		t.Errorf("%s: %d files, want %d", what, len(got), len(want))
	}
	for name, w := range want {
		if got[name] != w {
			t.Errorf("%s: %s differs", what, name)
		}
	}
}

// Bottles that were taken over give the bytes of a fresh run: after a bottle
// changed, after half of the entries are gone, after one is damaged, when rows
// moved, and when settings changed.
func TestCache(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	if err := smallDemo(t).Write(dir); err != nil {
		t.Fatal(err)
	}
	out, kept := filepath.Join(dir, "out"), filepath.Join(dir, "out.cache")
	entries := func() []string {
		list, err := filepath.Glob(filepath.Join(kept, "*"))
		if err != nil {
			t.Fatal(err)
		}
		return list
	}
	// again runs with the cache, and must take over as many bottles; then without
	// any, into another folder.
	again := func(what string, taken string) {
		t.Helper()
		r := call("run", dir, "--pictures=false").want(t, exitDone, exitDoubt)
		if !strings.Contains(r.err, taken) || taken == "" && strings.Contains(r.err, "unchanged bottle") {
			t.Errorf("%s: no %q in: %s", what, taken, r.err)
		}
		got := contents(t, out)
		runNoPictures(t, dir, "--fresh", "--out", filepath.Join(dir, "out.fresh"))
		sameFiles(t, what, got, contents(t, filepath.Join(dir, "out.fresh")))
		if len(entries()) != 23 {
			t.Errorf("%s: %d entries", what, len(entries()))
		}
	}
	again("first run", "")
	again("nothing changed", "23 unchanged bottles")

	scan := "scans/W103.txt"
	put(t, dir, scan, strings.Replace(read(t, dir, scan), ",", ",1", 40))
	again("a bottle changed", "22 unchanged bottles")

	for i, p := range entries() {
		if i%2 == 0 {
			if err := os.Remove(p); err != nil {
				t.Fatal(err)
			}
			continue
		}
		text := []byte(read(t, p))
		switch i % 3 {
		case 0:
			text[len(text)/2] ^= 1
		case 1:
			text = text[:len(text)/3]
		}
		if err := os.WriteFile(p, text, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	put(t, kept, "notes.txt", "mine")
	again2 := func(what, taken string) { // one strange file lies in the folder now
		t.Helper()
		if err := os.Remove(filepath.Join(kept, "notes.txt")); err != nil {
			t.Errorf("a file that is not ours is gone: %v", err)
		}
		again(what, taken)
		put(t, kept, "notes.txt", "mine")
	}
	runNoPictures(t, dir)
	again2("entries damaged", "23 unchanged bottles")

	rows := strings.Split(strings.TrimSpace(read(t, dir, "runsheet.csv")), "\n")
	slices.Reverse(rows[1:])
	put(t, dir, "runsheet.csv", strings.Join(rows, "\n")+"\n")
	again2("rows moved", "23 unchanged bottles")

	settings := read(t, dir, "survey.toml")
	put(t, dir, "survey.toml", strings.Replace(settings, "[report]\n", "[report]\ndigits = 3\n", 1)+"\n[quality]\naccept = { no-absorbance = \"known\", absorbance-limit = \"known\" }\n")
	again2("doubts accepted", "23 unchanged bottles")
	put(t, dir, "survey.toml", strings.Replace(settings, "offset = 60", "offset = 59", 1))
	again2("another offset", "")

	call("run", dir, "--pictures=false", "--fresh").want(t, exitDone, exitDoubt)
	if left := entries(); len(left) != 1 {
		t.Errorf("left after --fresh: %v", left)
	}
}
