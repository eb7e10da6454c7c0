package survey

import (
	"bytes"
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/testkit"
)

// TestSheetErrors: every fault is told with file, line, column and remedy.
func TestSheetErrors(t *testing.T) {
	const h = "id,kind,scans\n"
	kinds := "sample, blank, field-blank, standard, control, spike"
	for _, c := range []struct{ text, want string }{
		// ids
		{h + "S1,sample,a\nS2,sample,b\nS1,sample,c\n", `runsheet.csv:4: id: "S1" stands in line 2 too; give each bottle an id of its own, and name a repetition under replicate_of`},
		{h + "S1,sample,a\ns1,sample,b\n", `runsheet.csv:3: id: "s1" differs from "S1" in line 2 only in case or in how an accent is written; give one of them another id`},
		{h + "Müh,sample,a\nMu\u0308h,sample,b\n", "runsheet.csv:3: id: \"Mu\u0308h\" differs from \"Müh\" in line 2 only in case or in how an accent is written; give one of them another id"},
		{h + "=1+1,sample,a\n", `runsheet.csv:2: id: "=1+1" begins with =, which spreadsheets take for a formula; put a letter or digit before it`},
		{h + "+S1,sample,a\n", `runsheet.csv:2: id: "+S1" begins with +, which spreadsheets take for a formula; put a letter or digit before it`},
		{h + "-S1,sample,a\n", `runsheet.csv:2: id: "-S1" begins with -, which spreadsheets take for a formula; put a letter or digit before it`},
		{h + "@S1,sample,a\n", `runsheet.csv:2: id: "@S1" begins with @, which spreadsheets take for a formula; put a letter or digit before it`},
		{h + "\"S\t1\",sample,a\n", `runsheet.csv:2: id: "S\t1" holds the character '\t'; remove it`},
		{h + "\"S\n1\",sample,a\n", `runsheet.csv:2: id: "S\n1" holds the character '\n'; remove it`},
		{h + ",sample,a\n", `runsheet.csv:2: id: the id is missing; every row needs one of its own`},

		// kinds
		{h + "S1,samle,a\n", `runsheet.csv:2: kind: "samle" is no kind; write ` + kinds + `; did you mean "sample"?`},
		{h + "S1,field blank,a\n", `runsheet.csv:2: kind: "field blank" is no kind; write ` + kinds + `; did you mean "field-blank"?`},
		{h + "S1,x,a\n", `runsheet.csv:2: kind: "x" is no kind; write ` + kinds},
		{h + "S1,,a\n", `runsheet.csv:2: kind: the kind is missing; write ` + kinds},

		// paths
		{h + "S1,sample,\n", `runsheet.csv:2: scans: the scans are missing; write the file, folder or pattern of the bottle's raw scans, relative to the root`},
		{h + "S1,sample,../a\n", `runsheet.csv:2: scans: "../a" leaves the root by ..; write a path below it, or name the other folder as root under [sheet] in survey.toml`},
		{h + "S1,sample,a\\..\\..\\b\n", `runsheet.csv:2: scans: "a\\..\\..\\b" leaves the root by ..; write a path below it, or name the other folder as root under [sheet] in survey.toml`},
		{h + "S1,sample,/data/a\n", `runsheet.csv:2: scans: "/data/a" is not below the root; write the path relative to it, and name the folder as root under [sheet] in survey.toml`},
		{h + "S1,sample,C:\\a\n", `runsheet.csv:2: scans: "C:\\a" is not below the root; write the path relative to it, and name the folder as root under [sheet] in survey.toml`},
		{"id,kind,scans,absorbance\nS1,sample,a,../a.csv\n", `runsheet.csv:2: absorbance: "../a.csv" leaves the root by ..; write a path below it, or name the other folder as root under [sheet] in survey.toml`},

		// numbers
		{"id,kind,scans,dilution\nS1,sample,a,0.5\n", `runsheet.csv:2: dilution: "0.5" is too small; write a number of at least 1 (final volume / sample volume; 1 + 9 is 10)`},
		{"id,kind,scans,dilution\nS1,sample,a,1:10\n", `runsheet.csv:2: dilution: "1:10" is not a number; write final volume / sample volume; 1 + 9 is 10`},
		{"id,kind,scans,dilution\nS1,sample,a,####\n", `runsheet.csv:2: dilution: "####" is not a number; write final volume / sample volume; 1 + 9 is 10`},
		{"id,kind,scans,dilution\nS1,sample,a,inf\n", `runsheet.csv:2: dilution: "inf" is not a number; write final volume / sample volume; 1 + 9 is 10`},
		{"id,kind,scans,absorbance_dilution\nS1,sample,a,0\n", `runsheet.csv:2: absorbance_dilution: "0" is too small; write a number of at least 1 (final volume / sample volume; 1 + 9 is 10)`},
		{"id,kind,scans,absorbance_path_cm\nS1,sample,a,0\n", `runsheet.csv:2: absorbance_path_cm: "0" is too small; write a number above 0 (cm; the path of the absorbance cell, such as 1)`},
		{"id,kind,scans,doc_mg_per_l\nS1,sample,a,-1\n", `runsheet.csv:2: doc_mg_per_l: "-1" is too small; write a number of at least 0 (mg/L)`},
		{"id;kind;scans;dilution\nS1;sample;a;\"1,234\"\n", `runsheet.csv:2: dilution: "1,234" can be read as a decimal comma and as a thousands comma; write all numbers of the sheet with one decimal mark, and no thousands marks`},
		{"id;kind;scans;dilution\nS1;sample;a;1.5\nS2;sample;b;2,5\n", `runsheet.csv:3: dilution: "1.5" has a decimal point and "2,5" a decimal comma; write all numbers of the sheet with one decimal mark, and no thousands marks`},

		// dates
		{"id,kind,scans,measured\nS1,sample,a,03/05/2026\n", `runsheet.csv:2: measured: "03/05/2026" is no date that can be read in one way only; write it like 2026-05-03 or 2026-05-03T14:30`},
		{"id,kind,scans,sampled\nS1,sample,a,2026-02-30\n", `runsheet.csv:2: sampled: "2026-02-30" is no date that can be read in one way only; write it like 2026-05-03 or 2026-05-03T14:30`},
		{"id,kind,scans,sampled\nS1,sample,a,46145.5\n", `runsheet.csv:2: sampled: "46145.5" is a number; format the cell as a date, or write it like 2026-05-03`},
		{"id,kind,scans,sampled\nS1,sample,a,0026-05-03\n", `runsheet.csv:2: sampled: the year of "0026-05-03" cannot be right; write a date like 2026-05-03`},

		// rows that name others
		{"id,kind,scans,spike_of\nS1,spike,a,S2\nS22,sample,b,\n", `runsheet.csv:2: spike_of: there is no row with the id "S2"; did you mean "S22"?
runsheet.csv:2: conc: a spike needs a known concentration ("S1"); write it in a column conc:NAME [unit] with the component and its unit in the header, 0 where a component is absent`},
		{"id,kind,scans,replicate_of\nS1,sample,a,elsewhere\n", `runsheet.csv:2: replicate_of: there is no row with the id "elsewhere"; write an id of this sheet`},
		{"id,kind,scans,replicate_of\nS1,sample,a,S1\n", `runsheet.csv:2: replicate_of: the row names itself; write the id of the other bottle`},
		{"id,kind,scans,replicate_of\nS1,sample,a,S2\nS2,sample,b,S3\nS3,sample,c,S1\n", `runsheet.csv:4: replicate_of: "S3" repeats "S1", which in the end repeats "S3"; leave the cell of the first bottle empty`},
		{"id,kind,scans,conc:A\nS1,spike,a,3\n", `runsheet.csv:2: spike_of: a spike needs the id of the bottle without the addition here`},
		{"id,kind,scans,spike_of\nS1,sample,a,S2\nS2,sample,b,\n", `runsheet.csv:2: spike_of: the row's kind is sample; write kind spike, or empty this cell`},
		{"id,kind,scans,blanks\nS1,sample,a,B1;B3\nB1,blank,b,\nB2,blank,c,\n", `runsheet.csv:2: blanks: there is no row with the id "B3"; did you mean "B1"? (separate ids by semicolons)`},
		{"id,kind,scans,blanks\nS1,sample,a,F1\nF1,field-blank,b,\n", `runsheet.csv:2: blanks: "F1" is of kind field-blank; only a blank can be subtracted`},
		{"id,kind,scans,blanks\nS1,sample,a,\"B1, B1\"\nB1,blank,b,\n", `runsheet.csv:2: blanks: "B1" stands twice; remove one`},
		{"id,kind,scans,setup\nS1,sample,a,b2\n", `runsheet.csv:2: setup: the settings have no table [setup.b2]; did you mean "B2"?`},
		{"id,kind,scans,setup\nS1,sample,a,unheard\n", `runsheet.csv:2: setup: the settings have no table [setup.unheard]; the ones there are B2, old lamp`},
		{"id,kind,scans,exclude\nS1,sample,a,no\n", `runsheet.csv:2: exclude: "no" is no reason; write why, or leave the cell empty to keep the row`},

		// concentrations
		{h + "T1,standard,a\n", `runsheet.csv:2: conc: a standard needs a known concentration ("T1"); write it in a column conc:NAME [unit] with the component and its unit in the header, 0 where a component is absent`},
		{"id,kind,scans,conc:A\nT1,standard,a,-1\n", `runsheet.csv:2: conc:A: "-1" is negative; write the concentration in the liquid scanned`},
		{"id,kind,scans,conc:A\nT1,standard,a,low\n", `runsheet.csv:2: conc:A: "low" is not a number; write the concentration in the liquid scanned, 0 for none, or nothing where it is unknown`},
		{"id,kind,scans,conc:A [mg/L],CONC: a [µg/L]\nS1,sample,a,,\n", `runsheet.csv:1: CONC: a [µg/L]: the column stands twice ("conc:A [mg/L]" and "CONC: a [µg/L]"); rename or remove one`},
		{"id,kind,scans,conc: [mg/L]\nS1,sample,a,\n", `runsheet.csv:1: conc: [mg/L]: the column names no component; write conc:NAME or conc:NAME [unit]`},
		{"id,kind,scans,conc:=A\nS1,sample,a,\n", `runsheet.csv:1: conc:=A: "=A" begins with =, which spreadsheets take for a formula; put a letter or digit before it`},

		// the sheet as a whole
		{"id,kind,scan\nS1,sample,a\n", `runsheet.csv:1: scans: the column is missing; is it the one named "scan"? the header needs id, kind and scans`},
		{"sample,file\nS1,a\n", `runsheet.csv:1: id: the column is missing; the header needs id, kind and scans, and the delimiter must be comma, semicolon or tab
runsheet.csv:1: kind: the column is missing; the header needs id, kind and scans, and the delimiter must be comma, semicolon or tab
runsheet.csv:1: scans: the column is missing; the header needs id, kind and scans, and the delimiter must be comma, semicolon or tab`},
		{"id,kind,scans,ID\nS1,sample,a,b\n", `runsheet.csv:1: ID: the column stands twice ("id" and "ID"); rename or remove one`},
		{"id,kind,scans,note,Note\nS1,sample,a,b,c\n", `runsheet.csv:1: Note: the column stands twice ("note" and "Note"); rename or remove one`},
		{"id,kind,scans,,note\nS1,sample,a,b,c\n", `runsheet.csv:1: column 4 has cells and no name; name it, or empty its cells`},
		{h + "S1,sample,a,b\n", `runsheet.csv:2: the row has more cells than the header (cell 4 is "b"); name the column, or put a cell that holds the delimiter in quotes`},
		{h, `runsheet.csv: the run sheet has a header and no rows; write one row for every bottle, blank and standard`},
	} {
		dir := folder(t, map[string]string{"runsheet.csv": c.text})
		_, err := ReadSheet(dir, twoSetups())
		if msg := message(err, dir); msg != c.want {
			t.Errorf("%q\n got %s\nwant %s", c.text, msg, c.want)
		}
	}
}

// TestOddIDsAreLawful: what a file name may not hold, an id may.
func TestOddIDsAreLawful(t *testing.T) {
	ids := []string{`a/b`, `a\b`, `a:b`, `CON`, `con.1`, `..`, `x.`, `a*b?`, `<b>`, `</script>`, `ß`, `水 1`, `00012`, `1E5`, strings.Repeat("long", 2500)}
	text := "id,kind,scans\n"
	for i, id := range ids {
		text += fmt.Sprintf("%s,sample,s%d\n", id, i)
	}
	s, err := ReadSheet(folder(t, map[string]string{"runsheet.csv": text}), nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, id := range ids {
		if s.Rows[i].ID != id {
			t.Errorf("id %q, want %q", s.Rows[i].ID, id)
		}
	}
}

// TestSheetFiles: which file is the run sheet.
func TestSheetFiles(t *testing.T) {
	const ok = "id,kind,scans\nS1,sample,a\n"
	for _, c := range []struct {
		files map[string]string
		want  string
	}{
		{nil, "DIR: there is no run sheet (runsheet.csv or runsheet.xlsx); `tarnlight begin DIR` drafts one from the raw files"},
		{map[string]string{"runsheet.csv": ok, "runsheet.xlsx": "x"}, "DIR: both runsheet.csv and runsheet.xlsx are there, and nobody can know which counts; move one away"},
		{map[string]string{"RunSheet.csv": ok}, "DIR: there is no run sheet; RunSheet.csv must be named runsheet.csv"},
		{map[string]string{"runsheet.xls": ok}, "DIR: there is no run sheet; runsheet.xls must be saved as runsheet.xlsx"},
	} {
		dir := folder(t, c.files)
		_, err := ReadSheet(dir, nil)
		if msg := strings.ReplaceAll(fmt.Sprint(err), dir, "DIR"); msg != c.want {
			t.Errorf("%v\n got %s\nwant %s", c.files, msg, c.want)
		}
	}
	if _, err := ReadSheet(filepath.Join(t.TempDir(), "nothing"), nil); err == nil || !strings.Contains(err.Error(), "nothing") {
		t.Errorf("missing folder: %v", err)
	}
	for _, bad := range []string{"", "\n\n"} {
		dir := folder(t, map[string]string{"runsheet.csv": bad})
		if _, err := ReadSheet(dir, nil); err == nil || !strings.Contains(err.Error(), "runsheet.csv") {
			t.Errorf("empty file %q: %v", bad, err)
		}
	}
}

// TestSheetErrorsTogether: all faults at once, in the order of lines, twenty of
// them, and quickly even where every row is wrong.
func TestSheetErrorsTogether(t *testing.T) {
	dir := folder(t, map[string]string{"runsheet.csv": "id,kind,scans,dilution,replicate_of\n" +
		"S1,sampel,a,0.5,S9\nS2,sample,b,2,\nS2,,,x,\n"})
	_, err := ReadSheet(dir, nil)
	want := `runsheet.csv:2: kind: "sampel" is no kind; write sample, blank, field-blank, standard, control, spike; did you mean "sample"?
runsheet.csv:2: dilution: "0.5" is too small; write a number of at least 1 (final volume / sample volume; 1 + 9 is 10)
runsheet.csv:2: replicate_of: there is no row with the id "S9"; did you mean "S2"?
runsheet.csv:4: dilution: "x" is not a number; write final volume / sample volume; 1 + 9 is 10
runsheet.csv:4: kind: the kind is missing; write sample, blank, field-blank, standard, control, spike
runsheet.csv:4: id: "S2" stands in line 3 too; give each bottle an id of its own, and name a repetition under replicate_of
runsheet.csv:4: scans: the scans are missing; write the file, folder or pattern of the bottle's raw scans, relative to the root`
	if msg := message(err, dir); msg != want {
		t.Errorf("got\n%s\nwant\n%s", msg, want)
	}
	var b strings.Builder
	b.WriteString("id,kind,scans,dilution,replicate_of,spike_of,blanks\n")
	for i := range 20_000 {
		fmt.Fprintf(&b, "bottle%d,sampl,,0,none%d,none,none\n", i, i)
	}
	dir = folder(t, map[string]string{"runsheet.csv": b.String()})
	start := time.Now()
	_, err = ReadSheet(dir, nil)
	lines := strings.Split(fmt.Sprint(err), "\n")
	if len(lines) != maxProblems+1 || !strings.HasPrefix(lines[maxProblems], "and ") {
		t.Errorf("%d lines, last %q", len(lines), lines[len(lines)-1])
	}
	if d := time.Since(start); d > time.Minute { // measured: 0.3 s for 0.9 MB; the race detector on a busy machine needs 80 times that
		t.Errorf("20,000 bad rows took %v", d)
	}
}

// FuzzSheetCSV: no sheet panics or hangs; one that is read can be written and read
// back as the same rows.
func FuzzSheetCSV(f *testing.F) {
	for _, s := range []string{
		fullSheet, "id,kind,scans\nS1,sample,a\n", "id;kind;scans;dilution\nS1;sample;a;1,5\n", "", "id", "\xff\xfei\x00d\x00",
		"id,kind,scans,conc:A [x]\nT,standard,a,1e3\n", "id,kind,scans,measured\n\"a\nb\",blank,x,2026-05-03 14:00\n",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		var s *Sheet
		var err error
		// A wide header makes every short row as wide: see scanfile.FuzzTableCSV.
		head, _, _ := bytes.Cut(data, []byte("\n"))
		wide := (1 + bytes.Count(data, []byte("\n"))) * bytes.Count(head, []byte(",")) * 16
		testkit.Bounded(t, len(data)+wide, func() { s, err = readTable("runsheet.csv", data) })
		if err != nil {
			if !strings.Contains(err.Error(), "runsheet.csv") {
				t.Fatalf("the message does not name the file: %v", err)
			}
			return
		}
		var b bytes.Buffer
		if err := WriteSheetCSV(&b, s); err != nil {
			t.Fatal(err)
		}
		sameAgain(t, s, "runsheet.csv", b.Bytes())
	})
}
