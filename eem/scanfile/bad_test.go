package scanfile

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// rows makes a scan of emissions from, from+1, … with the given intensities.
func rows(pairs ...string) string { return strings.Join(pairs, "\n") + "\n" }

// Every file that cannot be used is an error that names file, line and remedy.
func TestRefusals(t *testing.T) {
	const scan = "Excitation: 240 nm\nnm\tcounts\n"
	wide := strings.Repeat("1,", MaxColumns) + "1\n"
	for _, c := range []struct {
		what, name, text string
		set              *Settings
		want             []string
	}{
		{"empty", "a.txt", "", nil, []string{"a.txt: is empty", "export"}},
		{"blanks only", "a.txt", " \r\n\t\r\n", nil, []string{"a.txt: is empty"}},
		{"text in the number column", "water_03.csv", rows("em,ex=240", "300,1.5", "301,1.6", "302,abc", "303,1.7"), nil,
			[]string{`water_03.csv:4: "abc" is not a number`, "blank"}},
		{"text in the first column", "w.csv", rows("em,ex=240", "300,1.5", "301,1.6", "3O2,1.5", "303,1.7"), nil,
			[]string{`w.csv:4: "3O2" is not a number`}},
		{"a letter beyond ASCII", "w.csv", rows("em,ex=240", "300,1.5", "301,12º", "302,1.6", "303,1.7"), nil, []string{`w.csv:3: "12º" is not a number`}},
		{"text in the last row", "w.txt", scan + rows("300\t1", "301\t2", "302\tx"), nil, []string{`w.txt:5: "x" is not a number`}},
		{"text in the first row", "w.txt", scan + rows("300\tx", "301\t2", "302\t3"), nil, []string{`w.txt:3: "x" is not a number`}},
		{"text in a grid", "g.csv", rows(`em\ex,240,250`, "300,1,2", "305,1,q", "310,1,2"), nil, []string{`g.csv:3: "q" is not a number`}},
		{"text in a long table", "l.csv", rows("ex,em,intensity", "240,300,1", "240,305,none of it", "240,310,1"), nil, []string{`l.csv:3: "none of it" is not a number`}},
		{"text in a long table with names", "l.csv", rows("sample,ex,em,intensity", "A,240,300,1", "A,240,305,bad", "A,240,310,1"), nil, []string{`l.csv:3: "bad" is not a number`}},
		{"no excitation", "scan7.txt", rows("nm\tcounts", "300\t1", "301\t2"), nil,
			[]string{"scan7.txt:2: no excitation", `"_ex{nm}"`}},
		{"pattern finds nothing", "scan7.txt", scan + rows("300\t1", "301\t2"), &Settings{Excitation: "_ex{nm}"},
			[]string{"scan7.txt:3: scans.excitation", "matches neither"}},
		{"header and name disagree", "S1_ex350.txt", scan + rows("300\t1", "301\t2"), nil,
			[]string{"S1_ex350.txt:3:", "240 nm", "350 nm", "scans.excitation"}},
		{"axis shorter than 2", "a_ex240.txt", rows("nm\tcounts", "300\t1"), nil, []string{"a_ex240.txt:2:", "only 1 wavelength"}},
		{"axis of one repeated point", "a_ex240.txt", rows("300\t1", "300\t2", "300\t3"), nil, []string{"a_ex240.txt:1:", "only 1 wavelength"}},
		{"ambiguous comma", "a_ex240.txt", rows("300\t1,234", "301\t1,250", "302\t987"), nil, []string{"a_ex240.txt:1:", `"1,234" can be read as`, "scans.decimal"}},
		{"both marks", "a_ex240.txt", rows("300\t1,25", "301\t1.25"), nil, []string{"a_ex240.txt:2:", "decimal point", "decimal comma", "scans.decimal"}},
		{"row cut short", "g.csv", rows(`em\ex,240,250`, "300,1,2", "305,1,2", "310,1"), nil, []string{"g.csv:4: 2 columns where the rows above have 3"}},
		{"row cut to its wavelength", "g.csv", rows(`em\ex,240,250`, "300,1,2", "305,1,2", "310"), nil, []string{"g.csv:4: 1 columns where the other rows have 3"}},
		{"no wavelength", "a_ex240.txt", rows("300;1", "301;2", ";3", "303;4"), nil, []string{"a_ex240.txt:3: no wavelength"}},
		{"no fluorometer's wavelength", "a_ex240.txt", rows("1\t5", "2\t6", "3\t7"), nil, []string{"a_ex240.txt:1: 1 nm is no wavelength"}},
		{"grid without excitations", "g.csv", rows("300,1,2,7", "305,1,2,7", "310,1,2,7"), nil, []string{"g.csv:1:", "excitation"}},
		{"grid forced", "g.csv", rows("300,1,2,7", "305,1,2,7"), &Settings{Form: Grid}, []string{"g.csv:1: no row of wavelengths"}},
		{"axes unclear", "g.csv", rows("x,300,310,320", "300,1,1,1", "310,1,1,1", "320,1,1,1"), nil, []string{"g.csv:2:", "scans.across", `em_nm\ex_nm`}},
		{"header against physics", "g.csv", rows("emission,400,450,500", "300,90,50,70", "310,90,50,60"), nil, []string{"g.csv:2:", "words of the header", "scans.across"}},
		{"long unclear", "l.csv", rows("300,300,1", "300,310,1", "310,300,1", "310,310,1"), nil, []string{"l.csv:1:", "ex_nm, em_nm, intensity"}},
		{"long with two intensities", "l.csv", rows("ex,em,F1 (a),F2 (b)", "240,300,1,2", "240,310,1,2"), nil, []string{"l.csv:1:", "name one column intensity"}},
		{"two intensities", "a_ex240.csv", rows("nm,counts S,counts R", "300,1,2", "310,1,2"), nil, []string{"a_ex240.csv:1:", "several columns are named"}},
		{"binary", "a.bin", "MZ\x90\x00\x03\x00\x00\x00\x04", nil, []string{"a.bin:1: holds NUL"}},
		{"workbook", "a.csv", "PK\x03\x04rest", nil, []string{"a.csv: is a workbook", "CSV"}},
		{"prose", "a.txt", "Dear reader,\nno numbers here.\n", nil, []string{"a.txt: holds no rows of numbers"}},
		{"wide", "a.csv", wide, nil, []string{"a.csv:1: more than 10,000 columns"}},
		{"skip too far", "a.csv", "300,1\n", &Settings{Skip: 5}, []string{"a.csv:", "scans.skip"}},
		{"unknown form", "a.csv", "300,1\n", &Settings{Form: "grids"}, []string{"scans.form", "stack"}},
		{"unknown delimiter", "a.csv", "300,1\n", &Settings{Delimiter: "|"}, []string{"scans.delimiter"}},
		{"pattern without nm", "a.csv", "300,1\n", &Settings{Excitation: "{id}"}, []string{"scans.excitation", "{nm}"}},
	} {
		_, err := ReadBytes(c.name, []byte(c.text), c.set)
		if err == nil {
			t.Errorf("%s: read without error", c.what)
			continue
		}
		for _, w := range c.want {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", c.what, err, w)
			}
		}
	}
}

func TestLoad(t *testing.T) {
	dir := t.TempDir()
	if _, err := Read(filepath.Join(dir, "none.txt"), nil); !os.IsNotExist(err) || !strings.Contains(err.Error(), "none.txt") {
		t.Errorf("missing file: %v", err)
	}
	if _, err := Read(dir, nil); err == nil || !strings.Contains(err.Error(), "folder") {
		t.Errorf("folder: %v", err)
	}
	if _, err := Load(os.DevNull); err == nil || !strings.Contains(err.Error(), "regular") {
		t.Errorf("device: %v", err)
	}
	big := filepath.Join(dir, "big.txt")
	if err := os.WriteFile(big, []byte("x"), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(big, 2<<30); err != nil {
		t.Skip(err)
	}
	if _, err := Load(big); err == nil || !strings.Contains(err.Error(), "larger than 256 MB") {
		t.Errorf("2 GB: %v", err)
	}
	if got, err := Load("bad_test.go"); err != nil || !bytes.Contains(got, []byte("func TestLoad")) {
		t.Errorf("Load: %v", err)
	}
}

// What is usable but needed a hand is noted.
func TestNotes(t *testing.T) {
	const text = "excitation 240\n302;1\n300;2\n301;OVER\n301;4\n303;####\n304;---\n"
	f, err := ReadBytes("a.txt", []byte(text), nil)
	if err != nil {
		t.Fatal(err)
	}
	got := map[string]float64{}
	for _, n := range f.Notes {
		if n.File != "a.txt" || n.Step != "read" || n.Msg == "" {
			t.Errorf("note %+v", n)
		}
		got[n.Test] = n.Value
	}
	want := map[string]float64{"read-guess": 0, "unsorted": 1, "repeated-point": 1, "saturated": 2}
	if len(got) != len(want) {
		t.Errorf("notes %v, want %v", got, want)
	}
	for k, v := range want {
		if got[k] != v {
			t.Errorf("%s: %g, want %g", k, got[k], v)
		}
	}
	s := f.Scans[0]
	// 301 nm stands twice, once over range: the number there is counts.
	if s.Em.Len() != 5 || s.F[0] != 2 || s.F[1] != 4 || s.F[2] != 1 || s.F[3] == s.F[3] || s.Line != 2 {
		t.Errorf("scan %v %v line %d", s.Em, s.F, s.Line)
	}
	if f.HeaderLines != 1 || f.FooterLines != 0 {
		t.Errorf("%d header and %d footer lines", f.HeaderLines, f.FooterLines)
	}
}

// The mean of a repeated point, and a descending axis, which is no disorder.
func TestRepeatedAndDescending(t *testing.T) {
	f, err := ReadBytes("a_ex240.csv", []byte("303,3\n302,1\n302,2\n301,7\n"), nil)
	if err != nil {
		t.Fatal(err)
	}
	if s := f.Scans[0]; s.Em.First() != 301 || s.F[0] != 7 || s.F[1] != 1.5 || s.F[2] != 3 {
		t.Errorf("%v %v", s.Em, s.F)
	}
	for _, n := range f.Notes {
		if n.Test == "unsorted" {
			t.Error("a descending axis was noted as unsorted")
		}
	}
}
