package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Every bad input of a survey: exit code, and a message that names file, line and
// remedy; older results stay as they are.
func TestBadInput(t *testing.T) {
	replace := func(old, now string) func(*tiny) {
		return func(y *tiny) {
			for i, l := range y.sheet {
				y.sheet[i] = strings.Replace(l, old, now, 1)
			}
		}
	}
	for _, c := range []struct {
		name   string
		change func(*tiny)
		code   int
		words  []string // all must be in the message, or in flags.csv where the run goes on
	}{
		{"missing file", func(y *tiny) { delete(y.files, "scans/W1.csv") }, exitDoubt, []string{"runsheet.csv", "scans/W1.csv", "no such file"}},
		{"empty file", func(y *tiny) { y.files["scans/W1.csv"] = "" }, exitDoubt, []string{"scans/W1.csv", "empty"}},
		{"text in the number column", func(y *tiny) {
			y.files["scans/W1.csv"] = strings.Replace(y.files["scans/W1.csv"], "\n320,", "\n320,abc", 1)
		}, exitDoubt, []string{"scans/W1.csv:4", "abc"}},
		{"two rows with one id", replace("W2,sample", "W1,sample"), exitFailed, []string{"runsheet.csv:7", "W1", "line 6", "replicate_of"}},
		{"ids that differ in case", replace("W2,sample", "w1,sample"), exitFailed, []string{"runsheet.csv:7", "w1", "W1"}},
		{"a raw file claimed twice", func(y *tiny) {
			y.files["scans/S1_a.csv"] = gridText(1, 1)
			y.files["scans/S10.csv"] = gridText(2, 1)
			y.sheet = append(y.sheet, "S1,sample,scans/S1*,2031-05-03,,,", "S10,sample,scans/S10.csv,2031-05-03,,,")
		}, exitFailed, []string{"runsheet.csv:9", "scans/S10.csv", `"S1" (line 8)`, `"S10" (line 9)`, "more exact"}},
		{"unknown kind", replace("W2,sample", "W2,sampel"), exitFailed, []string{"runsheet.csv:7", "sampel", "sample"}},
		{"unknown setting", func(y *tiny) { y.settings = "[scans]\nform = \"grid\"\ndelimeter = \"comma\"\n" }, exitFailed, []string{"survey.toml:3", "delimeter", "delimiter"}},
		{"excitation not found", func(y *tiny) { y.files["scans/W1.csv"] = "emission,intensity\n300,1\n310,2\n320,4\n" }, exitDoubt,
			[]string{"scans/W1.csv", "excitation"}},
		{"emission axis shorter than 2", func(y *tiny) { y.files["scans/W1.csv"] = "em_nm\\ex_nm,250,260\n300,1,2\n" }, exitDoubt,
			[]string{"scans/W1.csv", "2"}},
		{"a glob that matches nothing", replace("scans/W2.csv", "scans/Q*.csv"), exitDoubt, []string{"scans/Q*.csv", "matches no file"}},
		{"dilution 0.5", replace("W2,sample,scans/W2.csv,2031-05-03,", "W2,sample,scans/W2.csv,2031-05-03,0.5"), exitFailed,
			[]string{"runsheet.csv:7", "dilution", "0.5", "1"}},
		{"Raman units without blanks", func(y *tiny) {
			y.settings = strings.Replace(y.settings, `unit = "counts"`, `unit = "raman"`, 1)
			y.sheet = append(y.sheet[:1], y.sheet[2:]...)
		}, exitFailed, []string{"batch 2031-05-03", "Raman units", "no usable blank", "blanks column"}},
		{"a blank that does not cover the batch", func(y *tiny) {
			y.files["scans/B1.csv"] = "em_nm\\ex_nm,250,260\n300,10,10\n310,10.5,9.5\n320,9.5,10\n"
		}, exitDoubt, []string{"blank-range", "B1", "W1"}},
		{"both run sheets", func(y *tiny) { y.files["runsheet.xlsx"] = "x" }, exitFailed, []string{"runsheet.csv", "runsheet.xlsx"}},
		{"no run sheet columns", func(y *tiny) { y.sheet[0] = "name,what,where,measured,dilution,x,y" }, exitFailed, []string{"runsheet.csv:1", "id"}},
		{"every bottle bad", func(y *tiny) {
			for f := range y.files {
				y.files[f] = "nothing here\n"
			}
		}, exitFailed, []string{"not one bottle can be used", "scans/"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			y := newTiny()
			c.change(y)
			dir := y.write(t)
			put(t, dir, "before.txt", "x")
			before := listing(t, dir)
			r := call("run", dir, "--pictures=false").want(t, c.code)
			text := r.err
			if c.code == exitDoubt {
				text += read(t, dir, "out", "flags.csv")
			} else if after := listing(t, dir); after != before {
				t.Errorf("a failed run left traces:\nbefore %s\nafter %s", before, after)
			}
			for _, w := range c.words {
				if !strings.Contains(text, w) {
					t.Errorf("no %q in:\n%s", w, text)
				}
			}
		})
	}
}

// listing names every file below dir. The cache is left out: a run that failed keeps
// what it has read, so that the next one, with the fault mended, is quicker.
func listing(t *testing.T, dir string) string {
	t.Helper()
	var names []string
	err := filepath.WalkDir(dir, func(p string, d os.DirEntry, err error) error {
		if d.IsDir() && filepath.Ext(p) == ".cache" {
			return filepath.SkipDir
		}
		names = append(names, p)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return strings.Join(names, "\n")
}

// ids hold what files cannot: the maps get safe names, the tables the ids.
func TestAwkwardIDs(t *testing.T) {
	y := newTiny()
	for i, id := range []string{"a/b", `a\b`, "a:b", "CON"} {
		file := fmt.Sprintf("scans/odd%d.csv", i)
		y.files[file] = gridText(1, 1)
		y.sheet = append(y.sheet, fmt.Sprintf("%s,sample,%s,2031-05-03,,,", id, file))
	}
	dir := y.write(t)
	call("run", dir).want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "contributions.csv")
	for _, id := range []string{"a/b", `a\b`, "a:b", "CON"} {
		cell(t, c, "value", "id", id, "component", "a")
	}
	maps, err := os.ReadDir(filepath.Join(dir, "out", "maps"))
	if err != nil {
		t.Fatal(err)
	}
	if len(maps) != 10 {
		t.Errorf("%d maps, want one a bottle (10)", len(maps))
	}
	for _, m := range maps {
		if strings.ContainsAny(m.Name(), `/\:`) || strings.EqualFold(strings.TrimSuffix(m.Name(), filepath.Ext(m.Name())), "CON") {
			t.Errorf("unsafe file name %q", m.Name())
		}
	}
}

// A folder that holds anything else is not replaced.
func TestOutNotOurs(t *testing.T) {
	dir := newTiny().write(t)
	put(t, dir, "out/thesis.docx", "years of work")
	r := call("run", dir, "--pictures=false").want(t, exitFailed)
	if !strings.Contains(r.err, filepath.Join(dir, "out")) || !strings.Contains(r.err, "--out") {
		t.Errorf("message: %s", r.err)
	}
	if read(t, dir, "out", "thesis.docx") != "years of work" {
		t.Error("the file was touched")
	}
}

// A workbook that an office program has open is named before anything is computed.
func TestWorkbookOpen(t *testing.T) {
	dir := newTiny().write(t)
	call("run", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	before := read(t, dir, "out", "contributions.csv")
	put(t, dir, "out/report.xlsx", "x")
	put(t, dir, "out/~$report.xlsx", "x")
	r := call("run", dir, "--pictures=false").want(t, exitFailed)
	if !strings.Contains(r.err, "report.xlsx") {
		t.Errorf("message: %s", r.err)
	}
	if read(t, dir, "out", "contributions.csv") != before {
		t.Error("results were touched")
	}
}

// One bad bottle in 40: the others are reported, the bad one listed, exit 3; with
// --strict exit 1, and the results are there all the same.
func TestOneBadInForty(t *testing.T) {
	y := newTiny()
	for i := range 40 {
		y.add(fmt.Sprintf("X%02d", i), "sample", 0.5+0.02*float64(i), 1.5-0.02*float64(i), "")
	}
	y.files["scans/X17.csv"] = strings.Replace(gridText(1, 1), "\n320,", "\n320,what", 1)
	dir := y.write(t)
	r := call("run", dir, "--pictures=false").want(t, exitDoubt)
	if !strings.Contains(r.err, "X17") {
		t.Errorf("the bad bottle is not named: %s", r.err)
	}
	c := table(t, dir, "out", "contributions.csv")
	for i := range 40 {
		id := fmt.Sprintf("X%02d", i)
		q := cell(t, c, "qualifier", "id", id, "component", "a")
		if (q == "R") != (i == 17) {
			t.Errorf("%s: qualifier %q", id, q)
		}
		if i == 17 {
			if why := cell(t, c, "reasons", "id", id, "component", "a"); !strings.Contains(why, "scans/X17.csv:4") {
				t.Errorf("reason: %q", why)
			}
		}
	}
	call("run", dir, "--pictures=false", "--strict").want(t, exitFailed)
	call("verify", filepath.Join(dir, "out")).want(t, exitDone)
}

// Misuse of the command line is exit 2.
func TestMisuse(t *testing.T) {
	for _, args := range [][]string{{"run"}, {"run", "a", "b"}, {"run", "--nonsense", "a"}, {"nonsense"}} {
		r := call(args...)
		if r.code != exitMisuse {
			t.Errorf("%v: exit %d, want 2: %s", args, r.code, r.err)
		}
	}
	call("run", filepath.Join(t.TempDir(), "nowhere")).want(t, exitFailed)
}
