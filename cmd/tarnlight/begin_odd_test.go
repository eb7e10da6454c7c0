package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// What the pattern fits is a bottle that somebody measured: one that nobody can read
// is told once, stands in the sheet with the reason, and is a bottle when it comes as
// text. A copy of a scan in another form, and a photograph, are none.
func TestUnreadableOfThePattern(t *testing.T) {
	dir := nightFolder(t, "")
	put(t, dir, "survey.toml", "[sheet]\nname = \"{date}_{id}_ex{nm}\"\n")
	for _, name := range []string{"20310506_PW.csv", "20310506_W1.csv"} {
		if err := os.Remove(filepath.Join(dir, "scans", name)); err != nil {
			t.Fatal(err)
		}
	}
	stack(t, dir, "scans/20310506_W1", 1, 1)
	put(t, dir, "scans/20310506_W1_ex250.spc", "\x00\x00\x01SPC") // the same scan as text lies beside it
	put(t, dir, "scans/20310506_W2_ex240.spc", "\x00\x00\x01SPC")
	put(t, dir, "scans/20310506_W2_ex250.spc", "\x00\x00\x02SPC")
	put(t, dir, "scans/20310506_W3_ex240.xlsx", "PK\x03\x04\x00")
	put(t, dir, "scans/20310506_W4_ex240.txt", "error 17\n")
	put(t, dir, "scans/20310506_W5_ex240.jpg", "\xff\xd8\x00\x00")
	old(t, dir)
	r := call("begin", dir, "--add", "--csv").want(t, exitDoubt)
	for _, w := range []string{"not used: scans/20310506_W2_ex240.spc and 1 more like it: holds NUL bytes, so it is no text or was damaged; export it again as text",
		"not used: scans/20310506_W3_ex240.xlsx: a workbook or an archive", "not used: scans/20310506_W4_ex240.txt: no rows of numbers", "1 row\n",
		"set aside, with the reason under exclude: 3 rows (20310506_W2, 20310506_W3_ex240, 20310506_W4)", "not used: scans/20310506_W1_ex250.spc, scans/20310506_W5_ex240.jpg: holds NUL bytes"} {
		if strings.Count(r.err, w) != 1 {
			t.Errorf("no %q once in:\n%s", w, r.err)
		}
	}
	if s := cell(t, table(t, dir, "runsheet.csv"), "exclude", "id", "20310506_W2"); !strings.HasPrefix(s, "holds NUL bytes") {
		t.Errorf("the reason in the sheet: %q", s)
	}
	if r := call("begin", dir, "--add").want(t, exitDone); strings.Contains(r.err, "W2") || strings.Contains(r.err, "W3") || strings.Contains(r.err, "W4") {
		t.Errorf("told again: %s", r.err)
	}
	call("check", dir).want(t, exitDone, exitDoubt)
	stack(t, dir, "scans/20310506_W2", 1, 1)
	old(t, dir)
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.out, "W2") {
		t.Errorf("when it has come as text: %s%s", r.out, r.err)
	}
}

// A scan with an odd ending keeps its bottle out of the sheet no more: it is named,
// with the remedy, and where it is renamed the bottle is whole.
func TestOddEnding(t *testing.T) {
	dir := nightFolder(t, "")
	put(t, dir, "survey.toml", "[sheet]\nname = \"{date}_{id}_ex{nm}\"\n[scatter]\nrayleigh.first = \"off\"\nrayleigh.second = \"off\"\nraman.first = \"off\"\nraman.second = \"off\"\n[intensity]\nunit = \"counts\"\n")
	for _, name := range []string{"20310506_PW.csv", "20310506_W1.csv"} {
		if err := os.Remove(filepath.Join(dir, "scans", name)); err != nil {
			t.Fatal(err)
		}
	}
	for _, id := range []string{"W1", "W2", "W3"} {
		stack(t, dir, "scans/20310506_"+id, 1, 1)
	}
	bak := filepath.Join(dir, "scans", "20310506_W2_ex270.bak")
	txt := strings.TrimSuffix(bak, ".bak") + ".txt"
	if err := os.Rename(txt, bak); err != nil {
		t.Fatal(err)
	}
	old(t, dir)
	r := call("begin", dir, "--add", "--csv").want(t, exitDoubt)
	for _, w := range []string{"not used: scans/20310506_W2_ex270.bak: by its name it is a scan of W2", "not in \".bak\"; rename it like them", "3 rows", "1 row (20310506_W2_ex270)"} {
		if strings.Count(r.err, w) != 1 {
			t.Errorf("no %q once in:\n%s", w, r.err)
		}
	}
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") || strings.Contains(r.err, "bak") {
		t.Errorf("told again: %s", r.err)
	}
	call("check", dir).want(t, exitDone, exitDoubt)
	if err := os.Rename(bak, txt); err != nil {
		t.Fatal(err)
	}
	if r := call("begin", dir, "--add").want(t, exitDone); !strings.Contains(r.err, "nothing new") {
		t.Errorf("renamed: %s", r.err)
	}
	if r := call("check", dir).want(t, exitDone, exitDoubt); !strings.Contains(r.err, "4 bottles: 3 usable, 0 rejected, 1 excluded") || strings.Contains(r.out, "lacks") {
		t.Errorf("check: %s%s", r.out, r.err)
	}
}
