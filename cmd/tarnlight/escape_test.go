package main

import (
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// below lists what lies below a folder, results and the cache left out.
func below(t *testing.T, dir string, but ...string) string {
	t.Helper()
	var names []string
	err := filepath.WalkDir(dir, func(p string, d os.DirEntry, err error) error {
		for _, b := range but {
			if strings.HasPrefix(p, b) {
				return nil
			}
		}
		names = append(names, p)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return strings.Join(names, "\n")
}

// No cell of a run sheet reads outside the folder of the raw files: paths that leave
// it are refused with their line, and what is beside is never opened.
func TestSheetStaysBelowRoot(t *testing.T) {
	above := t.TempDir()
	put(t, above, "secret.csv", gridText(9, 9))
	for _, cell := range []string{"../secret.csv", "scans/../../secret.csv", "/etc/hostname", `..\secret.csv`, `C:\secret.csv`, "../*.csv", "scans/*/../../secret.csv", filepath.Join(above, "secret.csv")} {
		for _, column := range []string{"scans", "absorbance"} {
			y := newTiny()
			y.sheet[0] += ",absorbance"
			for i := range y.sheet {
				if i > 0 {
					y.sheet[i] += ","
				}
			}
			row := "W1,sample,scans/W1.csv,2031-05-03,,,,"
			bad := "W1,sample," + cell + ",2031-05-03,,,,"
			if column == "absorbance" {
				bad = row + cell
			}
			found := false
			for i, r := range y.sheet {
				if r == row {
					y.sheet[i], found = bad, true
				}
			}
			if !found {
				t.Fatalf("no row %s in %v", row, y.sheet)
			}
			dir := filepath.Join(above, "survey")
			for name, text := range y.files {
				put(t, dir, name, text)
			}
			put(t, dir, "runsheet.csv", strings.Join(y.sheet, "\n")+"\n")
			put(t, dir, "survey.toml", y.settings)
			r := call("run", dir, "--pictures=false").want(t, exitFailed)
			if !strings.Contains(r.err, "runsheet.csv:6: "+column) || !strings.Contains(r.err, "root") {
				t.Errorf("%s in %s: %s", cell, column, r.err)
			}
		}
	}
}

// Names that come from files never lead a result out of its folder: ids, batches,
// sites, components and titles with separators and dots, in run and in apply.
func TestResultsStayInFolder(t *testing.T) {
	testkit.Heavy(t)
	y := newTiny()
	odd := []string{"../../up", "..", "/tmp/abs", `..\..\up`, "a/../../b", "~/home", "C:up", "con"}
	y.sheet[0] = strings.NewReplacer("conc:a", "conc:../../a", "conc:b", "conc:/tmp/b").Replace(y.sheet[0]) + ",site,batch"
	for i := range y.sheet[1:] {
		y.sheet[i+1] += ",../site,../../batch"
	}
	for i, id := range odd {
		file := "scans/odd" + string(rune('a'+i)) + ".csv"
		y.files[file] = gridText(1, 0.1*float64(i))
		y.sheet = append(y.sheet, id+",sample,"+file+",2031-05-03,,,,../site,../../batch")
	}
	above := t.TempDir()
	dir := filepath.Join(above, "x", "y", "survey")
	for name, text := range y.files {
		put(t, dir, name, text)
	}
	put(t, dir, "runsheet.csv", strings.Join(y.sheet, "\n")+"\n")
	put(t, dir, "survey.toml", "title = \"../../title\"\n"+y.settings)
	out := filepath.Join(dir, "out")
	before, temp := below(t, above, out), below(t, os.TempDir(), above)
	call("run", dir).want(t, exitDone, exitDoubt)
	put(t, dir, "model.json", read(t, out, "model.json"))
	call("apply", filepath.Join(dir, "model.json"), dir).want(t, exitDone, exitDoubt)
	if err := os.Remove(filepath.Join(dir, "model.json")); err != nil {
		t.Fatal(err)
	}
	if after := below(t, above, out); after != before {
		t.Errorf("something was written outside of the results:\n%s\nbefore:\n%s", after, before)
	}
	for _, name := range []string{"up", "abs", "b", "a"} { // what the names above would have made
		if p := filepath.Join(os.TempDir(), name); !strings.Contains(temp, p) {
			if _, err := os.Stat(p); err == nil {
				t.Errorf("%s was written", p)
			}
		}
	}
	maps, err := os.ReadDir(filepath.Join(out, "maps"))
	if err != nil || len(maps) < len(odd)+5 {
		t.Errorf("%d maps: %v", len(maps), err)
	}
	call("verify", out).want(t, exitDone, exitDoubt)
}

// Links are not followed while a folder is looked through: what they point to may lie
// anywhere.
func TestBeginFollowsNoLinks(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("links need rights there")
	}
	above := t.TempDir()
	put(t, above, "elsewhere/W9.csv", gridText(1, 1))
	dir := filepath.Join(above, "survey")
	put(t, dir, "scans/W1.csv", gridText(1, 1))
	for link, to := range map[string]string{"scans/W2.csv": "../../elsewhere/W9.csv", "more": "../elsewhere", "loop": "."} {
		if err := os.Symlink(to, filepath.Join(dir, link)); err != nil {
			t.Fatal(err)
		}
	}
	r := call("begin", dir, "--csv").want(t, exitDone)
	if rows := readSheet(t, filepath.Join(dir, "runsheet.csv")).Rows; len(rows) != 1 || rows[0].ID != "W1" {
		t.Errorf("drafted:\n%s", r.out)
	}
}

// A workbook of the results that is open in an office program, by either kind of
// owner file, is named before anything is computed, and a run sheet that is open is
// read all the same.
func TestOpenElsewhere(t *testing.T) {
	dir := newTiny().write(t)
	runNoPictures(t, dir)
	put(t, dir, "out/report.xlsx", "x")
	before := read(t, dir, "out", "contributions.csv")
	for _, owner := range []string{"~$report.xlsx", "~$port.xlsx", ".~lock.report.xlsx#"} {
		put(t, dir, "out/"+owner, "somebody")
		r := call("run", dir, "--pictures=false").want(t, exitFailed)
		for _, w := range []string{"report.xlsx: is open in another program", "close it there", owner + " behind: delete that file", "nothing was touched"} {
			if !strings.Contains(r.err, w) {
				t.Errorf("%s: no %q in %s", owner, w, r.err)
			}
		}
		if read(t, dir, "out", "contributions.csv") != before {
			t.Errorf("%s: results were touched", owner)
		}
		if err := os.Remove(filepath.Join(dir, "out", owner)); err != nil {
			t.Fatal(err)
		}
	}
	put(t, dir, ".~lock.runsheet.csv#", "somebody")
	runNoPictures(t, dir)
}
