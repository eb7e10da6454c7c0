package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/survey"
	"tarnlight/unmix/outdir"
)

// old makes every file below dir look as if it was written an hour ago.
func old(t *testing.T, dir string) {
	t.Helper()
	when := time.Now().Add(-time.Hour)
	err := filepath.WalkDir(dir, func(p string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			err = os.Chtimes(p, when, when)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
}

// stack writes one file per excitation.
func stack(t *testing.T, dir, stem string, a, b float64) {
	t.Helper()
	for j, ex := range tinyEx {
		var s strings.Builder
		for k, em := range tinyEm {
			fmt.Fprintf(&s, "%g\t%.3f\n", em, tinyCell(a, b, j, k))
		}
		put(t, dir, fmt.Sprintf("%s_ex%g.txt", stem, ex), s.String())
	}
}

func absorbanceText(top float64) string {
	var s strings.Builder
	s.WriteString("wavelength_nm,absorbance\n")
	for nm := 230; nm <= 400; nm += 10 {
		fmt.Fprintf(&s, "%d,%.5f\n", nm, top*float64(410-nm)/180)
	}
	return s.String()
}

// A mess as people make it, read by a pattern: days as folders, blanks and accents
// in names, kinds by words of the laboratory and of everybody, repetitions by number
// and by word, stacks and grids, absorbance told by content and given to the bottle of
// its own day, and one name on two days.
func TestBeginByPattern(t *testing.T) {
	dir := t.TempDir()
	put(t, dir, "survey.toml", "[sheet]\nname = \"{date}/{kind} {id}\"\nkinds = {reinst = \"blank\"}\n")
	for _, day := range []string{"2031-05-06", "20310507"} {
		put(t, dir, "Gerät 1/"+day+"/Reinst W.csv", gridText(0, 0))
		stack(t, dir, "Gerät 1/"+day+"/sample Mühle 3", 1, 1)
		put(t, dir, "abs/"+day+"/Mühle 3.csv", absorbanceText(0.2))
	}
	put(t, dir, "Gerät 1/20310507/dup Mühle 3.csv", gridText(1, 1))
	put(t, dir, "Gerät 1/20310507/std 25.csv", gridText(2, 0))
	put(t, dir, "Gerät 1/20310507/lamp.txt", "mercury lamp changed\n")
	put(t, dir, "Gerät 1/20310507/test.csv", gridText(2, 0))
	r := call("begin", dir, "--csv").want(t, exitDone)
	sheet := table(t, dir, "runsheet.csv")
	for _, want := range [][6]string{ // id, kind, scans, absorbance, measured, replicate_of
		{"W", "blank", "Gerät 1/2031-05-06/Reinst W.csv", "", "2031-05-06", ""},
		{"W 2031-05-07", "blank", "Gerät 1/20310507/Reinst W.csv", "", "2031-05-07", ""},
		{"Mühle 3", "sample", "Gerät 1/2031-05-06/sample Mühle 3_ex*.txt", "abs/2031-05-06/Mühle 3.csv", "2031-05-06", ""},
		{"Mühle 3 2031-05-07", "sample", "Gerät 1/20310507/sample Mühle 3_ex*.txt", "abs/20310507/Mühle 3.csv", "2031-05-07", ""},
		{"Mühle 3-dup", "sample", "Gerät 1/20310507/dup Mühle 3.csv", "", "2031-05-07", "Mühle 3 2031-05-07"},
		{"25", "standard", "Gerät 1/20310507/std 25.csv", "", "2031-05-07", ""},
		{"test", "sample", "Gerät 1/20310507/test.csv", "", "", ""}, // set aside
	} {
		for i, c := range []string{"kind", "scans", "absorbance", "measured", "replicate_of"} {
			if got := cell(t, sheet, c, "id", want[0]); got != want[i+1] {
				t.Errorf("%s: %s is %q, want %q", want[0], c, got, want[i+1])
			}
		}
	}
	if len(sheet.Rows) != 7 {
		t.Errorf("%d rows, want 7\n%s", len(sheet.Rows), r.out)
	}
	for i := range sheet.Rows {
		id, why := sheet.Text(i, sheet.Col("id")), sheet.Text(i, sheet.Col("exclude"))
		if want := map[string]string{"test": "its name does not follow {date}/{kind} {id}; correct this row and empty this cell to use it"}[id]; why != want {
			t.Errorf("%s is excluded because %q, want %q", id, why, want)
		}
	}
	for _, w := range []string{"test.csv: its name does not follow {date}/{kind} {id}", "lamp.txt"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in:\n%s", w, r.err)
		}
	}
	if r := call("check", dir).want(t, exitFailed); !strings.Contains(r.err, "runsheet.csv") || !strings.Contains(r.err, "a standard needs a known concentration") {
		t.Errorf("a standard without its concentration: %s", r.err)
	}
}

// A pattern that all names follow is proposed, and works; {n} is a repetition of a
// whole EEM and counts the scans of a stack.
func TestBeginProposes(t *testing.T) {
	for want, files := range map[string][]string{
		"{date}_{kind}_{id}": {"20310506_blank_PW1.csv", "20310506_sample_W1.csv"},
		"{date}/{id}":        {"2031-05-06/PW1.csv", "2031-05-06/W1.csv", "2031-05-07/W1.csv"},
		"{id}":               {"PW1.csv", "W1.csv"},
	} {
		dir := t.TempDir()
		for _, f := range files {
			put(t, dir, f, gridText(1, 1))
		}
		r := call("begin", dir, "--csv").want(t, exitDone)
		if !strings.Contains(r.err, "the names follow "+want+";") || !strings.Contains(read(t, dir, "survey.toml"), want) {
			t.Errorf("%v: %s", files, r.err)
		}
		put(t, dir, "survey.toml", strings.Replace(read(t, dir, "survey.toml"), "# name", "name", 1))
		old(t, dir)
		if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") {
			t.Errorf("%s: %s", want, r.err)
		}
	}
	dir := t.TempDir()
	put(t, dir, "W1-1.csv", gridText(1, 1))
	put(t, dir, "W1-2.csv", gridText(1, 1))
	call("begin", dir, "--csv", "--name", "{id}-{n}").want(t, exitDone)
	if of := cell(t, table(t, dir, "runsheet.csv"), "replicate_of", "id", "W1-2"); of != "W1" {
		t.Errorf("the second of W1 repeats %q", of)
	}
	dir = t.TempDir()
	for i, ex := range tinyEx {
		put(t, dir, fmt.Sprintf("W1-%d.txt", i+1), fmt.Sprintf("excitation: %g\n300\t1\n310\t%d\n320\t2\n", ex, i+2))
	}
	call("begin", dir, "--csv", "--name", "{id}-{n}").want(t, exitDone)
	if s := cell(t, table(t, dir, "runsheet.csv"), "scans", "id", "W1"); s != "W1-*.txt" {
		t.Errorf("a numbered stack: %q", s)
	}
}

// A file that names its samples is one bottle each, with the sample's name as its id;
// one whose name another bottle has already is told.
func TestBeginDayFile(t *testing.T) {
	day := func(ids ...string) string {
		s := "sample,ex_nm,em_nm,intensity\n"
		for _, id := range ids {
			for i, ex := range []int{240, 250} {
				s += fmt.Sprintf("%s,%d,300,%d\n%s,%d,305,%d\n", id, ex, i+1, id, ex, i+2)
			}
		}
		return s
	}
	dir := folder(t, map[string]string{"survey.toml": "[sheet]\nname = \"{date}\"\n"})
	if r := call("begin", dir).want(t, exitFailed); !strings.Contains(r.err, "{id} is missing") {
		t.Errorf("a pattern without an id: %s", r.err)
	}
	put(t, dir, "survey.toml", "[sheet]\nname = \"{date} {id}\"\nkinds = {PW = \"blank\"}\n")
	put(t, dir, "2031-05-06 run.csv", day("PW1", "W 1", "W2"))
	old(t, dir)
	call("begin", dir, "--add", "--csv").want(t, exitDone)
	put(t, dir, "2031-05-07 run.csv", day("W3", "W2"))
	old(t, dir)
	if r := call("begin", dir, "--add").want(t, exitDoubt); !strings.Contains(r.err, "it holds a sample W2, and another bottle has that id") {
		t.Errorf("a name twice: %s", r.err)
	}
	got := sheetRows(t, dir, "runsheet.csv")
	want := "[[PW1 blank 2031-05-06 run.csv  2031-05-06] [W 1 sample 2031-05-06 run.csv  2031-05-06] [W2 sample 2031-05-06 run.csv  2031-05-06] [W3 sample 2031-05-07 run.csv  2031-05-07] [W2 (2) sample 2031-05-07 run.csv  2031-05-07]]"
	if fmt.Sprint(got) != want {
		t.Errorf("rows %v, want %s", got, want)
	}
	put(t, dir, "2031-05-07 run.csv", day("W3", "W2", "W4")) // it grows over the day
	old(t, dir)
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.HasSuffix(r.out, "\nW4  sample  2031-05-07 run.csv      1\n") || strings.Contains(r.err, "W2") {
		t.Errorf("a sample more in a file that is known: %s%s", r.out, r.err)
	}
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") {
		t.Errorf("nothing more in it: %s%s", r.out, r.err)
	}
}

// Names that a cell of the run sheet cannot hold, or a pattern would take for more:
// each bottle's cell names its own files and no other.
func TestBeginOddNames(t *testing.T) {
	dir := t.TempDir()
	names := []string{"a[1].csv", "a1.csv", " lead.csv", "b\u00a0c.csv", "st*r.csv", "Mu\u0308hle.csv"}
	for i, n := range names {
		put(t, dir, "scans/"+n, gridText(1, float64(i)))
	}
	stack(t, dir, "scans/R1", 1, 2)
	stack(t, dir, "scans/R10", 1, 2)
	stack(t, dir, "[x] y/R1", 1, 2)
	put(t, dir, "one/W1.txt", "excitation: 250\n300\t1\n310\t3\n320\t2\n") // one excitation each
	put(t, dir, "one/W2.txt", "excitation: 250\n300\t1\n310\t4\n320\t2\n")
	call("begin", dir, "--csv").want(t, exitDone)
	r := call("check", dir).want(t, exitDone, exitDoubt)
	if n := len(table(t, dir, "runsheet.csv").Rows); n != len(names)+5 {
		t.Errorf("%d rows\n%s", n, read(t, dir, "runsheet.csv"))
	}
	if strings.Contains(r.out, "reject") || !strings.Contains(r.err, " 0 rejected") {
		t.Errorf("check:\n%s%s\n%s", r.out, r.err, read(t, dir, "runsheet.csv"))
	}
}

// begin --add appends rows for new files only. What is there keeps every byte (CSV)
// or every row (workbook), young files wait and are named, what follows no pattern or
// needs a person is told once, set aside in the sheet, and is exit 3, nothing new is
// exit 0.
func TestBeginAdd(t *testing.T) {
	for _, sheet := range []string{"runsheet.csv", "runsheet.xlsx"} {
		dir := t.TempDir()
		add := func(codes ...int) result {
			return call("begin", dir, "--add", "--csv="+fmt.Sprint(sheet == "runsheet.csv")).want(t, codes...)
		}
		if r := call("begin", dir, "--add").want(t, exitFailed); !strings.Contains(r.err, "survey.toml") || !strings.Contains(r.err, `name = "{date}_{kind}_{id}"`) {
			t.Errorf("without a pattern: %s", r.err)
		}
		put(t, dir, "survey.toml", "[sheet]\nname = \"{date}_{id}\"\nkinds = {PW = \"blank\", ST = \"standard\"}\n")
		if r := add(exitDone); !strings.Contains(r.err, "nothing new") {
			t.Errorf("an empty folder: %s", r.err)
		}
		stack(t, dir, "scans/20310506_W1", 1, 1)
		put(t, dir, "scans/20310506_PW.csv", gridText(0, 0))
		put(t, dir, "abs/20310506_W1.csv", absorbanceText(0.1))
		old(t, dir)
		if r := add(exitDone); !strings.Contains(r.out, "W1") || !strings.Contains(r.err, "2 rows") {
			t.Errorf("the first night: %s%s", r.out, r.err)
		}
		first := read(t, dir, sheet)
		if r := add(exitDone); !strings.Contains(r.err, "nothing new") || read(t, dir, sheet) != first {
			t.Errorf("a second time: %s", r.err)
		}

		put(t, dir, "scans/20310507_PW.csv", gridText(0, 0))
		put(t, dir, "scans/20310507_W1.csv", gridText(1, 2))
		put(t, dir, "scans/20310507_ST1.csv", gridText(2, 0)) // a standard
		put(t, dir, "scans/20310507_W3.csv", "")              // nothing came
		put(t, dir, "scans/20310507_notes.txt", "windy\n")
		put(t, dir, "scans/test.csv", gridText(2, 0))
		stack(t, dir, "scans/20310507_W2", 1, 1)
		put(t, dir, "scans/20310506_W1_ex280.txt", "300\t1\n310\t3\n320\t2\n") // claimed by the row's pattern
		put(t, dir, "scans/20310506_W1.csv", gridText(1, 1))                   // a row is there and does not name it
		old(t, dir)
		now := time.Now().Add(-30 * time.Second)
		if err := os.Chtimes(filepath.Join(dir, "scans/20310507_W2_ex270.txt"), now, now); err != nil {
			t.Fatal(err)
		}
		r := add(exitDoubt)
		for _, w := range []string{"test.csv: its name does not follow", "20310507_ST1.csv: ST1 is a standard", "20310507_W3.csv: is empty", "belongs to W1, whose row (line 3)",
			"set aside, with the reason under exclude: 3 rows (W1 (2), ST1, test)", "waits for the next run: W2 (3 files, first: scans/20310507_W2_ex250.txt), written 30s ago", "3 rows"} {
			if !strings.Contains(r.err, w) {
				t.Errorf("%s: no %q in:\n%s", sheet, w, r.err)
			}
		}
		if second := read(t, dir, sheet); sheet == "runsheet.csv" && !strings.HasPrefix(second, first) {
			t.Errorf("old bytes changed:\n%s\n%s", first, second)
		}
		r = call("begin", dir, "--add", "--settle", "10s").want(t, exitDone) // what was left out is told once
		if !strings.Contains(r.err, "1 row") || !strings.Contains(r.out, "W2 ") {
			t.Errorf("settled: %s%s", r.out, r.err)
		}
		rows := sheetRows(t, dir, sheet)
		want := [][]string{{"PW", "blank", "scans/20310506_PW.csv", "", "2031-05-06"}, {"W1", "sample", "scans/20310506_W1_ex*.txt", "abs/20310506_W1.csv", "2031-05-06"},
			{"PW 2031-05-07", "blank", "scans/20310507_PW.csv", "", "2031-05-07"}, {"W1 2031-05-07", "sample", "scans/20310507_W1.csv", "", "2031-05-07"},
			{"W3", "sample", "scans/20310507_W3.csv", "", "2031-05-07"},
			{"W1 (2)", "sample", "scans/20310506_W1.csv", "", "2031-05-06"}, {"ST1", "standard", "scans/20310507_ST1.csv", "", "2031-05-07"},
			{"test", "sample", "scans/test.csv", "", ""},
			{"W2", "sample", "scans/20310507_W2_ex*.txt", "", "2031-05-07"}}
		for i := range want {
			if i >= len(rows) || strings.Join(rows[i], "|") != strings.Join(want[i], "|") {
				t.Errorf("%s: row %d is %v, want %v", sheet, i, rows, want[i])
				break
			}
		}
		if len(rows) != len(want) {
			t.Errorf("%s: %d rows, want %d", sheet, len(rows), len(want))
		}
		if _, err := os.Stat(filepath.Join(dir, "runsheet.lock")); err == nil {
			t.Error("the lock was left behind")
		}
	}
}

// A new bottle waits for its young absorbance; a half-written scan that says nothing
// yet makes its bottle wait.
func TestBeginAddWaits(t *testing.T) {
	dir := folder(t, map[string]string{"survey.toml": "[sheet]\nname = \"{id}_ex{nm}\"\n"})
	stack(t, dir, "W1", 1, 1)
	put(t, dir, "W1.csv", absorbanceText(0.1))
	stack(t, dir, "W2", 1, 1)
	old(t, dir)
	put(t, dir, "W1.csv", absorbanceText(0.1))
	put(t, dir, "W2_ex280.txt", "30")
	r := call("begin", dir, "--add").want(t, exitDone)
	for _, w := range []string{"run: W1 (W1.csv)", "run: W2 (4 files, first: W2_ex250.txt)", "nothing new"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in:\n%s", w, r.err)
		}
	}
	put(t, dir, "W2_ex280.txt", "")
	ahead := time.Now().Add(time.Hour)
	old(t, dir)
	if err := os.Chtimes(filepath.Join(dir, "W1_ex250.txt"), ahead, ahead); err != nil {
		t.Fatal(err)
	}
	if r := call("begin", dir, "--add", "--settle", "0s").want(t, exitDone, exitDoubt); !strings.Contains(r.err, "ahead of this machine's clock") || !strings.Contains(r.out, "W2  sample  W2_ex*.txt      4\n") || strings.Contains(r.err, "not used") {
		t.Errorf("a clock that runs ahead: %s%s", r.out, r.err)
	}
}

// Two jobs at once, a workbook that somebody has open, a sheet that cannot be read:
// each is told, and no byte changes.
func TestBeginAddStops(t *testing.T) {
	dir := folder(t, map[string]string{"survey.toml": "[sheet]\nname = \"{id}\"\n", "W1.csv": gridText(1, 1)})
	old(t, dir)
	call("begin", dir, "--add").want(t, exitDone)
	put(t, dir, "W2.csv", gridText(1, 1))
	old(t, dir)
	before := read(t, dir, "runsheet.xlsx")
	stops := func(what string, words ...string) {
		t.Helper()
		r := call("begin", dir, "--add").want(t, exitFailed)
		for _, w := range words {
			if !strings.Contains(r.err, w) {
				t.Errorf("%s: no %q in %s", what, w, r.err)
			}
		}
		if read(t, dir, "runsheet.xlsx") != before {
			t.Errorf("%s: the sheet was touched", what)
		}
	}
	release, err := outdir.Hold(filepath.Join(dir, "runsheet.lock"))
	if err != nil {
		t.Fatal(err)
	}
	stops("two at once", fmt.Sprintf("process %d is at work here", os.Getpid()), "or end it")
	if err := release(); err != nil {
		t.Fatal(err)
	}
	for _, owner := range []string{"~$runsheet.xlsx", ".~lock.runsheet.xlsx#"} {
		put(t, dir, owner, "x")
		stops(owner, "runsheet.xlsx", "is open in another program", owner)
		if err := os.Remove(filepath.Join(dir, owner)); err != nil {
			t.Fatal(err)
		}
	}
	put(t, dir, "runsheet.xlsx", before[:len(before)/2])
	broken := before
	before = before[:len(before)/2]
	stops("half a workbook", "runsheet.xlsx")
	before = broken
	put(t, dir, "runsheet.xlsx", before)
	put(t, dir, "runsheet.csv", "id,kind,scans\n")
	stops("two sheets", "both runsheet.csv and runsheet.xlsx")
}

// sheetRows reads id, kind, scans, absorbance and measured of a run sheet.
func sheetRows(t *testing.T, dir, name string) [][]string {
	t.Helper()
	s := readSheet(t, filepath.Join(dir, name))
	var out [][]string
	for _, r := range s.Rows {
		out = append(out, []string{r.ID, string(r.Kind), r.Scans, r.Absorbance, r.Measured.Day()})
	}
	return out
}

// Dilutions come from the names too, so that a diluted bottle of a night job is
// brought back to what was in it.
func TestBeginReadsDilutions(t *testing.T) {
	for _, sheet := range []string{"runsheet.csv", "runsheet.xlsx"} {
		dir := t.TempDir()
		put(t, dir, "survey.toml", "[sheet]\nname = \"{date}_{id}_d{dilution}\"\n")
		put(t, dir, "scans/20310506_W1_d1.csv", gridText(1, 1))
		put(t, dir, "scans/20310506_W1_d2,5.csv", gridText(1, 2))
		put(t, dir, "scans/20310506_W2_d0.csv", gridText(2, 1))
		old(t, dir)
		r := call("begin", dir, "--add", "--csv="+fmt.Sprint(sheet == "runsheet.csv")).want(t, exitDoubt)
		if !strings.Contains(r.err, "the dilution 0 in its name is below 1") {
			t.Errorf("a dilution of 0: %s", r.err)
		}
		s, err := survey.ReadSheet(dir, nil)
		if err != nil {
			t.Fatal(err)
		}
		if len(s.Rows) != 3 || !strings.HasPrefix(s.Rows[2].Exclude, "the dilution 0") || s.Rows[0].Dilution != 1 || s.Rows[1].Dilution != 2.5 || s.Rows[1].AbsorbanceDilution != 2.5 || s.Rows[1].ReplicateOf != s.Rows[0].ID {
			t.Errorf("%s: %+v", sheet, s.Rows)
		}
	}
}
