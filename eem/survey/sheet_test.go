package survey

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"tarnlight/eem"
)

// folder writes files into a new survey folder.
func folder(t testing.TB, files map[string]string) string {
	t.Helper()
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

// settings with two setups.
func twoSetups() *Settings {
	s := Default()
	s.Setups = map[string]*Setup{"old lamp": {}, "B2": {}}
	return s
}

func clock(t *testing.T, layout, text string) Time {
	t.Helper()
	v, err := time.Parse(layout, text)
	if err != nil {
		t.Fatal(err)
	}
	return Time{Time: v, DateOnly: len(layout) == len(time.DateOnly), Text: text}
}

// every column, every kind
const fullHeader = "id,Kind, SCANS ,absorbance,absorbance_path_cm,setup,measured,sampled,site,batch,blanks,dilution,absorbance_dilution," +
	"replicate_of,spike_of,exclude,exclude_from_fit,doc_mg_per_l,temperature_c,conc:Trp [µg/L],conc:benzo[a]pyrene,Remark\n"

const fullSheet = fullHeader +
	`W1,blank,scans/W1*,,,old lamp,2026-05-03,,,,,,,,,,,,,,,pure water` + "\n" +
	`"W,2",blank,scans/W2,,,,2026-05-03T09:30,,,b1,,,,,,,,,,,` + "\n" +
	`S1,sample,scans\S1,absorbance/S1.csv,5,B2,2026-05-03T14:05:30+02:00,2026-05-01,"Mill, weir",b1,"W1; W,2",10,2,,,,,4.5,18.25,,,"two` + "\nlines\"\n" +
	`S1b,Sample,./scans/S1b/,,,,,,,,"W,2",2.5,,S1,,,,,,,,` + "\n" +
	`F1,field-blank,scans/F1,,,,,,,,,,,,,,,,,,,` + "\n" +
	`T1,standard,scans/T1,,,,,,,,,,,,,,,,,50,0,` + "\n" +
	`C1,control,scans/C1,,,,,,,,,,,,,,"odd lamp",,,25,n/a,` + "\n" +
	`K1,spike,scans/K1,,,,,,,,,,,,S1,,,,,10,,` + "\n" +
	`X1,sample,,,,,,,,,,,,,,broken,,,,,,` + "\n"

func TestEveryColumn(t *testing.T) {
	dir := folder(t, map[string]string{"runsheet.csv": fullSheet})
	got, err := ReadSheet(dir, twoSetups())
	if err != nil {
		t.Fatal(err)
	}
	row := func(id string, kind Kind, scans string, line int, change func(*Row)) Row {
		r := NewRow()
		r.ID, r.Kind, r.Scans, r.Line = id, kind, scans, line
		if change != nil {
			change(&r)
		}
		return r
	}
	want := []Row{
		row("W1", Blank, "scans/W1*", 2, func(r *Row) { r.Setup = "old lamp"; r.Measured = clock(t, time.DateOnly, "2026-05-03") }),
		row("W,2", Blank, "scans/W2", 3, func(r *Row) { r.Measured = clock(t, "2006-01-02T15:04", "2026-05-03T09:30"); r.Batch = "b1" }),
		row("S1", Sample, "scans/S1", 4, func(r *Row) {
			r.Absorbance, r.AbsorbancePathCM, r.Setup, r.Site, r.Batch = "absorbance/S1.csv", 5, "B2", "Mill, weir", "b1"
			r.Measured, r.Sampled = clock(t, time.RFC3339, "2026-05-03T14:05:30+02:00"), clock(t, time.DateOnly, "2026-05-01")
			r.Blanks, r.Dilution, r.AbsorbanceDilution = []string{"W1", "W,2"}, 10, 2
			r.DOC, r.TemperatureC = 4.5, 18.25
		}),
		row("S1b", Sample, "scans/S1b", 6, func(r *Row) {
			r.Blanks, r.Dilution, r.AbsorbanceDilution, r.ReplicateOf = []string{"W,2"}, 2.5, 2.5, "S1"
		}),
		row("F1", FieldBlank, "scans/F1", 7, nil),
		row("T1", Standard, "scans/T1", 8, func(r *Row) { r.Conc = []Conc{{"Trp", "µg/L", 50}, {"benzo[a]pyrene", "", 0}} }),
		row("C1", Control, "scans/C1", 9, func(r *Row) { r.ExcludeFromFit = "odd lamp"; r.Conc = []Conc{{"Trp", "µg/L", 25}} }),
		row("K1", Spike, "scans/K1", 10, func(r *Row) { r.SpikeOf = "S1"; r.Conc = []Conc{{"Trp", "µg/L", 10}} }),
		row("X1", Sample, "", 11, func(r *Row) { r.Exclude = "broken" }),
	}
	if d := cmp.Diff(want, got.Rows, cmpopts.EquateNaNs(), cmpopts.IgnoreFields(Row{}, "Cells")); d != "" {
		t.Errorf("rows (-want +got):\n%s", d)
	}
	if d := cmp.Diff(strings.Split("id,Kind,SCANS", ","), got.Columns[:3]); d != "" || len(got.Columns) != 22 {
		t.Errorf("%d columns, the first ones (-want +got):\n%s", len(got.Columns), d)
	}
	for i, want := range []string{"pure water", "", "two\nlines"} {
		if r := got.Rows[i]; len(r.Cells) != 22 || r.Cells[21] != want || r.Cells[0] != r.ID {
			t.Errorf("row %s carries %q; want %q at the end of 22", r.ID, r.Cells, want)
		}
	}
	if day := got.Rows[2].Measured.Day(); day != "2026-05-03" {
		t.Errorf("day %q", day)
	}
	if (Time{}).Day() != "" {
		t.Error("the zero Time has a day")
	}
	if r, ok := got.Find("K1"); !ok || r.Kind != Spike {
		t.Errorf("Find(K1) = %v, %v", r, ok)
	}
	if _, ok := got.Find("k1"); ok {
		t.Error("Find(k1) found a row")
	}
}

// TestSpellingsOfOneSheet: delimiter, decimal mark, encoding and line ends change
// nothing.
func TestSpellingsOfOneSheet(t *testing.T) {
	const text = "id,kind,scans,dilution,conc:Trp [µg/L],site\n" +
		"S1,sample,s1,1.5,,Säge\nT1,standard,t1,,12.25,\nT2,standard,t2,10,1000,\n"
	comma := func(s string) string {
		return strings.NewReplacer(",", ";", "1.5", "1,5", "12.25", "12,25").Replace(s)
	}
	want, err := ReadSheet(folder(t, map[string]string{"runsheet.csv": text}), nil)
	if err != nil {
		t.Fatal(err)
	}
	latin := strings.NewReplacer("µ", "\xb5", "ä", "\xe4")
	for name, s := range map[string]string{
		"semicolon":         strings.ReplaceAll(text, ",", ";"),
		"tab":               strings.ReplaceAll(text, ",", "\t"),
		"decimal comma":     comma(text),
		"tab, comma":        strings.ReplaceAll(comma(text), ";", "\t"),
		"byte-order mark":   "\ufeff" + text,
		"quoted header":     "\ufeff" + strings.Replace(text, "id", `"id"`, 1),
		"CRLF":              strings.ReplaceAll(text, "\n", "\r\n"),
		"CR":                strings.ReplaceAll(text, "\n", "\r"),
		"Windows-1252":      latin.Replace(text),
		"UTF-16":            utf16LE(text),
		"no last line end":  strings.TrimSuffix(text, "\n"),
		"blank lines":       strings.ReplaceAll(text, "\n", "\n\n"),
		"empty last column": strings.ReplaceAll(text, "\n", ",\n"),
	} {
		got, err := ReadSheet(folder(t, map[string]string{"runsheet.csv": s}), nil)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if d := cmp.Diff(want.Rows, got.Rows, cmpopts.EquateNaNs(), cmpopts.IgnoreFields(Row{}, "Cells", "Line")); d != "" {
			t.Errorf("%s (-want +got):\n%s", name, d)
		}
		if d := cmp.Diff(want.Columns, got.Columns); d != "" {
			t.Errorf("%s (-want +got):\n%s", name, d)
		}
	}
	if r := want.Rows; r[0].Dilution != 1.5 || r[1].Conc[0].Value != 12.25 || r[2].Conc[0].Value != 1000 || r[0].Site != "Säge" {
		t.Errorf("rows %+v", r)
	}
}

func utf16LE(s string) string {
	b := []byte{0xff, 0xfe}
	for _, r := range s { // all of the basic plane
		b = append(b, byte(r), byte(r>>8))
	}
	return string(b)
}

func TestNotesOfSheet(t *testing.T) {
	for _, c := range []struct {
		text string
		want []string // severity, test, message
	}{
		{"id,kind,scans,depth_m,Comment,date\nS1,sample,s1,2,,x\n", nil},
		{"id,kind,scans,dilutoin\nS1,sample,s1,10\n", []string{
			`doubt sheet-column runsheet.csv:1: column "dilutoin" is only carried along; if it was meant to be dilution, rename it`}},
		{"id,kind,scans,Replicate Of\nS1,sample,s1,\n", []string{
			`doubt sheet-column runsheet.csv:1: column "Replicate Of" is only carried along; if it was meant to be replicate_of, rename it`}},
		{"id,kind,scans,sites\nS1,sample,s1,\n", []string{
			`note sheet-column runsheet.csv:1: column "sites" is only carried along; if it was meant to be site, rename it`}},
		{"id,kind,scans,sites,site\nS1,sample,s1,,\n", nil},
		{"id,kind,scans,conc_Trp\nS1,sample,s1,\n", []string{
			`doubt sheet-column runsheet.csv:1: column "conc_Trp" is only carried along; if it holds known concentrations, write it conc:NAME or conc:NAME [unit]`}},
		{"id,kind,scans,conc:Trp [µg/L]\nS1,sample,s1,3\n", []string{
			`note sheet-conc runsheet.csv:2: "S1" is of kind sample, so that its known concentration of "Trp" is not used`}},
	} {
		dir := folder(t, map[string]string{"runsheet.csv": c.text})
		s, err := ReadSheet(dir, nil)
		if err != nil {
			t.Errorf("%q: %v", c.text, err)
			continue
		}
		var got []string
		for _, n := range s.Notes {
			if n.Test == "" || n.Test == "read-guess" {
				continue
			}
			eem.FlagFrom(n, "", "") // panics where the code is not on the list
			p := Problem{File: filepath.Base(n.File), Line: n.Line, Msg: n.Msg}
			got = append(got, n.Severity.String()+" "+n.Test+" "+p.Error())
		}
		if d := cmp.Diff(c.want, got); d != "" {
			t.Errorf("%q (-want +got):\n%s", c.text, d)
		}
	}
}

func TestExclusions(t *testing.T) {
	s := Default()
	s.Sheet.Exclusions = "exclusions.csv"
	const sheet = "id,kind,scans,exclude\nS1,sample,s1,\nS2,sample,s2,spilled\nS3,sample,,\n"
	dir := folder(t, map[string]string{"runsheet.csv": sheet,
		"exclusions.csv": "reason;ID;by\nbubble;S1;me\nlamp off;S2;me\nlost;S3;me\n"})
	got, err := ReadSheet(dir, s)
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []string{"bubble", "spilled; lamp off", "lost"} {
		if got.Rows[i].Exclude != want {
			t.Errorf("row %d is excluded for %q, want %q", i, got.Rows[i].Exclude, want)
		}
	}
	for _, c := range []struct{ text, want string }{
		{"id,reason\nS1,bubble\nS22,odd\n", `exclusions.csv:3: id: there is no row with the id "S22"; did you mean "S2"?`},
		{"id,reason\nS1,\n", `exclusions.csv:2: reason: "S1" is excluded without a reason; write why`},
		{"id,reason\nS1,yes\n", `exclusions.csv:2: reason: "S1" is excluded without a reason; write why`},
		{"id,reason\n,odd\n", `exclusions.csv:2: id: the id is missing; write the id of the row to exclude`},
		{"id,why\nS1,odd\n", `exclusions.csv:1: exclusions need the columns id and reason; the header has "id, why"`},
	} {
		dir := folder(t, map[string]string{"runsheet.csv": strings.Replace(sheet, "S3,sample,,", "S3,sample,s3,", 1), "exclusions.csv": c.text})
		_, err := ReadSheet(dir, s)
		if msg := message(err, dir); msg != c.want {
			t.Errorf("%q\n got %s\nwant %s", c.text, msg, c.want)
		}
	}
	dir = folder(t, map[string]string{"runsheet.csv": sheet})
	if _, err := ReadSheet(dir, s); err == nil || !strings.Contains(err.Error(), "exclusions") {
		t.Errorf("missing exclusions: %v", err)
	}
}

// message is the text of an error without the folder in front of file names.
func message(err error, dir string) string {
	if err == nil {
		return "no error"
	}
	return strings.ReplaceAll(err.Error(), dir+string(filepath.Separator), "")
}

func TestNewRow(t *testing.T) {
	r := NewRow()
	if r.AbsorbancePathCM != 1 || r.Dilution != 1 || r.AbsorbanceDilution != 1 || !math.IsNaN(r.DOC) || !math.IsNaN(r.TemperatureC) {
		t.Errorf("%+v", r)
	}
}
