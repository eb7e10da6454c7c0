package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/scanfile"
)

// nightFolder is a folder whose names follow a pattern, with a sheet of two bottles.
func nightFolder(t *testing.T, sheet string) string {
	t.Helper()
	dir := folder(t, map[string]string{"survey.toml": "[sheet]\nname = \"{date}_{id}\"\nkinds = {PW = \"blank\", ST = \"standard\"}\n",
		"scans/20310506_PW.csv": gridText(0, 0), "scans/20310506_W1.csv": gridText(1, 1)})
	if sheet != "" {
		put(t, dir, "runsheet.csv", sheet)
	}
	old(t, dir)
	return dir
}

// What no pattern fits is told on its first night, stands in the sheet with the
// reason, and is silent afterwards; something new is told again. A row that is
// corrected is a bottle, one that is deleted is told again.
func TestAsideIsToldOnce(t *testing.T) {
	dir := nightFolder(t, "")
	add := func(code int, words ...string) string {
		t.Helper()
		r := call("begin", dir, "--add", "--csv").want(t, code)
		for _, w := range words {
			if !strings.Contains(r.err, w) {
				t.Errorf("no %q in:\n%s", w, r.err)
			}
		}
		return r.err
	}
	add(exitDone, "2 rows")
	put(t, dir, "scans/trial run.csv", gridText(2, 0))
	stack(t, dir, "scans/rinse", 1, 1)
	old(t, dir)
	add(exitDoubt, "not used: scans/rinse_ex250.txt and 2 more like it: its name does not follow {date}_{id}", "not used: scans/trial run.csv: its name",
		"set aside, with the reason under exclude: 2 rows (rinse, trial run)", "ignore under [sheet] in survey.toml")
	sheet := read(t, dir, "runsheet.csv")
	for range 2 {
		if said := add(exitDone, "nothing new"); strings.Contains(said, "not used") || read(t, dir, "runsheet.csv") != sheet {
			t.Errorf("told again: %s", said)
		}
	}
	put(t, dir, "scans/another.csv", gridText(2, 1))
	old(t, dir)
	if said := add(exitDoubt, "another.csv"); strings.Contains(said, "trial run") {
		t.Errorf("told again: %s", said)
	}

	put(t, dir, "survey.toml", "[scatter]\nrayleigh.first = \"off\"\nrayleigh.second = \"off\"\nraman.first = \"off\"\nraman.second = \"off\"\n[intensity]\nunit = \"counts\"\n"+read(t, dir, "survey.toml"))
	if r := call("check", dir).want(t, exitDoubt); !strings.Contains(r.err, "5 bottles: 2 usable, 0 rejected, 3 excluded") || strings.Contains(r.out, "used by no row") {
		t.Errorf("check: %s%s", r.out, r.err)
	}
	row := "trial run,sample,scans/trial run.csv,,,,,,its name does not follow {date}_{id}; correct this row and empty this cell to use it"
	if !strings.Contains(sheet, row) {
		t.Fatalf("no row %q in:\n%s", row, sheet)
	}
	put(t, dir, "runsheet.csv", strings.Replace(read(t, dir, "runsheet.csv"), row, "T1,sample,scans/trial run.csv,,2031-05-06,,,,", 1))
	add(exitDone, "nothing new")
	if r := call("check", dir).want(t, exitDoubt); !strings.Contains(r.err, "5 bottles: 3 usable, 0 rejected, 2 excluded") {
		t.Errorf("check: %s%s", r.out, r.err)
	}
	put(t, dir, "runsheet.csv", strings.Join(strings.SplitAfter(sheet, "\n")[:3], ""))
	add(exitDoubt, "3 rows (another, rinse, trial run)")
}

// Without a place for the reason nothing is added, and it is told again; a name
// under ignore ends it, for a file and for a folder with all that is in it.
func TestIgnore(t *testing.T) {
	dir := nightFolder(t, "id,kind,scans\nPW,blank,scans/20310506_PW.csv\nW1,sample,scans/20310506_W1.csv\n")
	sheet := read(t, dir, "runsheet.csv")
	put(t, dir, "scans/trial run.csv", gridText(2, 0))
	put(t, dir, "last year/a/W7.csv", gridText(2, 0))
	old(t, dir)
	for range 2 {
		r := call("begin", dir, "--add").want(t, exitDoubt)
		if !strings.Contains(r.err, "give the sheet a column exclude") || read(t, dir, "runsheet.csv") != sheet {
			t.Errorf("no column for the reason: %s", r.err)
		}
	}
	put(t, dir, "survey.toml", strings.Replace(read(t, dir, "survey.toml"), "[sheet]\n", "[sheet]\nignore = [\"trial*\", \"last year\"]\n", 1))
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") || !strings.Contains(r.err, "because [sheet] ignore names them: 2") {
		t.Errorf("ignored: %s", r.err)
	}
	if r := call("check", dir).want(t, exitDone, exitDoubt); strings.Contains(r.out, "used by no row") {
		t.Errorf("check misses what is ignored: %s", r.out)
	}
	put(t, dir, "survey.toml", "[sheet]\nignore = [\"*\"]\n")
	if r := call("begin", dir, "--add").want(t, exitFailed); !strings.Contains(r.err, "survey.toml:2") || !strings.Contains(r.err, `"*" is every file`) {
		t.Errorf("ignoring all: %s", r.err)
	}
}

// A file that has the name and the ending of a scan and nothing in it is a bottle:
// told once, rejected by check with the reason, and read when it has come.
func TestEmptyFileKeepsItsPlace(t *testing.T) {
	dir := nightFolder(t, "")
	put(t, dir, "scans/20310506_W2.csv", "")
	put(t, dir, "scans/20310506_photo.jpg", "\xff\xd8\x00\x00")
	old(t, dir)
	r := call("begin", dir, "--add", "--csv").want(t, exitDoubt)
	for _, w := range []string{"20310506_W2.csv: is empty; export it again; its row is there", "3 rows", "not used: scans/20310506_photo.jpg: holds NUL bytes"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in:\n%s", w, r.err)
		}
	}
	call("begin", dir, "--add").want(t, exitDone)
	if r := call("check", dir).want(t, exitDoubt); !strings.Contains(r.out, "scans/20310506_W2.csv: is empty") {
		t.Errorf("check: %s", r.out)
	}
	put(t, dir, "scans/20310506_W2.csv", gridText(1, 2))
	old(t, dir)
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") {
		t.Errorf("when it has come: %s", r.err)
	}
	if r := call("check", dir).want(t, exitDoubt, exitDone); !strings.Contains(r.err, " 0 rejected") {
		t.Errorf("check: %s%s", r.out, r.err)
	}
}

// Where names tell standards the draft has a column for what they hold, begin says
// whose it must be filled for, and check and run name file, row and remedy until it
// is, and the header while it still holds the words of the draft.
func TestDraftHasConcentrations(t *testing.T) {
	for _, name := range []string{"runsheet.csv", "runsheet.xlsx"} {
		dir := nightFolder(t, "")
		put(t, dir, "scans/20310506_ST1.csv", gridText(2, 0))
		r := call("begin", dir, fmt.Sprintf("--csv=%v", name == "runsheet.csv")).want(t, exitDone)
		if !strings.Contains(r.err, "1 bottle needs known concentrations (ST1): fill in what they hold: component and unit in the header conc:NAME [unit]") {
			t.Errorf("begin: %s", r.err)
		}
		if cols := readSheetColumns(t, dir, name); cols[len(cols)-1] != "conc:NAME [unit]" {
			t.Errorf("columns %q", cols)
		}
		for _, verb := range []string{"check", "run"} {
			r := call(verb, dir).want(t, exitFailed)
			for _, w := range []string{name + ":3: conc: a standard needs a known concentration (\"ST1\")", "component and its unit in the header"} {
				if !strings.Contains(r.err, w) {
					t.Errorf("%s: no %q in %s", verb, w, r.err)
				}
			}
		}
	}
	dir := nightFolder(t, "id,kind,scans,conc:NAME [unit]\nPW,blank,scans/20310506_PW.csv,\nST1,standard,scans/20310506_W1.csv,25\n")
	if r := call("run", dir).want(t, exitFailed); !strings.Contains(r.err, "runsheet.csv:1: conc:NAME [unit]: NAME stands for a component; write its own in this header") {
		t.Errorf("a header as drafted: %s", r.err)
	}
	put(t, dir, "runsheet.csv", strings.Replace(read(t, dir, "runsheet.csv"), "NAME", "pyrene", 1))
	if r := call("run", dir).want(t, exitFailed); !strings.Contains(r.err, "[unit] stands for the unit") {
		t.Errorf("a unit as drafted: %s", r.err)
	}
	put(t, dir, "runsheet.csv", "id,kind,scans,conc:pyrene [µg/L],conc:NAME [unit]\nPW,blank,scans/20310506_PW.csv,,\nST1,standard,scans/20310506_W1.csv,25,\n")
	if r := call("check", dir).want(t, exitDone, exitDoubt); strings.Contains(r.out+r.err, "NAME") {
		t.Errorf("an empty column of the draft: %s%s", r.out, r.err)
	}
}

func readSheetColumns(t *testing.T, dir, name string) []string {
	t.Helper()
	tab, err := scanfile.ReadTable(filepath.Join(dir, name))
	if err != nil {
		t.Fatal(err)
	}
	return tab.Header
}

// What begin does not take it says in one line for all of one kind, with where such
// a file belongs; what the settings name it does not miss.
func TestBeginTellsWhatIsLeft(t *testing.T) {
	dir := folder(t, map[string]string{"W1.csv": gridText(1, 1), "W1 abs.csv": absorbanceText(0.2), "W9 abs.csv": absorbanceText(0.2), "W8 abs.csv": absorbanceText(0.2),
		"concentrations.csv": "id;tryptophan mg/L\nS1;1,5\n", "limits.csv": "component,detection_limit\na,0.1\n",
		"emission.csv": "wavelength_nm,factor\n240,1\n600,1\n", "backup.zip": "PK\x03\x04\x00\x00", "notes.md": "# rain\n", "log.txt": "nothing\n",
		"~$runsheet.xlsx": "\x00", ".DS_Store": "\x00", "thumbs.db": "\xd0\xcf", "cut.csv": gridText(1, 1)[:95]})
	r := call("begin", dir, "--csv").want(t, exitDone)
	for _, w := range []string{
		"not used: W8 abs.csv, W9 abs.csv: absorbance, and no new bottle has its name",
		"not used: concentrations.csv, limits.csv: no scan but a table; known concentrations belong into conc: columns",
		"not used: emission.csv: spectral factors; name them as emission_factors",
		"not used: backup.zip: a workbook or an archive",
		"not used: log.txt, notes.md: no rows of numbers",
	} {
		if strings.Count(r.err, w) != 1 {
			t.Errorf("no %q once in:\n%s", w, r.err)
		}
	}
	if n := strings.Count(r.err, "not used"); n != 5 || strings.Contains(r.err, "DS_Store") {
		t.Errorf("%d lines of what is left:\n%s", n, r.err)
	}
	if s := cell(t, table(t, dir, "runsheet.csv"), "scans", "id", "cut"); s != "cut.csv" {
		t.Errorf("a grid that breaks off: %q", s)
	}
	put(t, dir, "survey.toml", "[sheet]\nname = \"{id}\"\n[correct]\nemission_factors = \"emission.csv\"\n[quantify]\nlimits = \"limits.csv\"\n")
	old(t, dir)
	r = call("begin", dir, "--add").want(t, exitDone)
	if strings.Contains(r.err, "emission.csv") || strings.Contains(r.err, "limits.csv") || !strings.Contains(r.err, "concentrations.csv: no scan but a table; known concentrations belong into conc: columns of the run sheet, limits are named under [quantify] limits in survey.toml (with the columns id, tryptophan mg/L)") {
		t.Errorf("files that the settings name: %s", r.err)
	}
}

// begin reads scans as the settings say, so that what only they make readable is a
// bottle too.
func TestBeginReadsBySettings(t *testing.T) {
	dir := folder(t, map[string]string{"W1.csv": "1,2,3,4\n5,6,7,8\n" + gridText(1, 1)})
	put(t, dir, "survey.toml", "[scans]\nform = \"grid\"\nskip = 2\n")
	if r := call("begin", dir, "--csv").want(t, exitDone); !strings.Contains(r.out, "W1  sample  W1.csv      1") {
		t.Errorf("%s%s", r.out, r.err)
	}
	if r := call("check", dir).want(t, exitDone, exitDoubt); !strings.Contains(r.err, "1 usable") {
		t.Errorf("%s%s", r.out, r.err)
	}
}

// A survey folder or a root that is itself a link is looked into; links inside are
// named, and so is a folder that nobody may look into: the rest goes on.
func TestBeginAmongLinks(t *testing.T) {
	dir := folder(t, map[string]string{"real/scans/W1.csv": gridText(1, 1), "elsewhere/W2.csv": gridText(1, 2), "real/locked/W3.csv": gridText(2, 2)})
	for from, to := range map[string]string{"link": "real", "real/moved": filepath.Join("..", "elsewhere"), "real/scans/W4.csv": filepath.Join("..", "..", "elsewhere", "W2.csv")} {
		if err := os.Symlink(to, filepath.Join(dir, from)); err != nil {
			t.Skip("no links here: ", err)
		}
	}
	link := filepath.Join(dir, "link")
	r := call("begin", link, "--csv").want(t, exitDone)
	if !strings.Contains(r.out, "scans/W1.csv") || strings.Count(r.err, "not used: moved, scans/W4.csv: links are not followed") != 1 {
		t.Errorf("a link to the folder: %s%s", r.out, r.err)
	}
	put(t, dir, "real/survey.toml", "[sheet]\nroot = \"moved\"\n")
	if err := os.Remove(filepath.Join(link, "runsheet.csv")); err != nil {
		t.Fatal(err)
	}
	if r := call("begin", link, "--csv").want(t, exitDone); !strings.Contains(r.out, "W2.csv") {
		t.Errorf("a root that is a link: %s%s", r.out, r.err)
	}
	call("check", link).want(t, exitDone, exitDoubt)

	locked := filepath.Join(dir, "real", "locked")
	if err := os.Chmod(locked, 0); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.Chmod(locked, 0o755) })
	if _, err := os.ReadDir(locked); err == nil {
		t.Log("not tried: this user may look into every folder")
		return
	}
	put(t, dir, "real/survey.toml", "[sheet]\nname = \"{id}\"\n")
	old(t, filepath.Join(dir, "real", "scans"))
	if r := call("begin", link, "--add").want(t, exitDoubt); !strings.Contains(r.out, "W1") || !strings.Contains(r.err, "not used: locked: it cannot be looked into (permission denied)") {
		t.Errorf("a folder that is locked: %s%s", r.out, r.err)
	}
}

// A file whose odd name the sheet has no letters for keeps no other bottle out.
func TestAsideWithoutLetters(t *testing.T) {
	dir := nightFolder(t, "id,kind,scans,exclude,remark\nPW,blank,scans/20310506_PW.csv,,M\xfchle\n") // Windows-1252
	put(t, dir, "scans/水.csv", gridText(2, 0))
	old(t, dir)
	r := call("begin", dir, "--add").want(t, exitDoubt)
	if !strings.Contains(r.out, "W1") || !strings.Contains(r.err, "has no room for a character of the new rows; save it as UTF-8") || !strings.Contains(r.err, "1 row") {
		t.Errorf("with a bottle: %s%s", r.out, r.err)
	}
	sheet := read(t, dir, "runsheet.csv")
	if r := call("begin", dir, "--add").want(t, exitDoubt); !strings.Contains(r.err, "told again the next time") || read(t, dir, "runsheet.csv") != sheet {
		t.Errorf("alone: %s", r.err)
	}
	if n := len(sheetRows(t, dir, "runsheet.csv")); n != 2 {
		t.Errorf("%d rows", n)
	}
}

// What a file manager leaves in the folder of a bottle is none of its scans.
func TestLitterBesideScans(t *testing.T) {
	dir := t.TempDir()
	stack(t, dir, "W1/W1", 1, 1)
	call("begin", dir, "--csv").want(t, exitDone)
	if s := cell(t, table(t, dir, "runsheet.csv"), "scans", "id", "W1"); s != "W1" {
		t.Fatalf("the cell is %q, not the folder", s)
	}
	put(t, dir, "W1/Thumbs.db", "\xd0\xcf\x11\xe0")
	put(t, dir, "W1/desktop.ini", "[.ShellClassInfo]\r\n")
	put(t, dir, "W1/.DS_Store", "\x00")
	if r := call("check", dir).want(t, exitDone, exitDoubt); !strings.Contains(r.err, " 0 rejected") {
		t.Errorf("%s%s", r.out, r.err)
	}
}
