package scanfile

import (
	"archive/zip"
	"bytes"
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/xuri/excelize/v2"
)

func TestTableCSV(t *testing.T) {
	want := []Record{{2, []string{"S1", "sample", "a, b", "1,5"}}, {3, []string{"B;1", "blank", "two\nlines", ""}}, {6, []string{"S2", "sample", "", ""}}}
	for _, s := range styles() {
		if s.delim == " " || s.dec == "," {
			continue
		}
		text := s.row("id", "kind", "scans", "path") + s.row("S1", "sample", `"a, b"`, `"1,5"`) + s.row(`"B;1"`, "blank", `"two`+s.eol+`lines"`, "") +
			s.row("", "", "", "") + s.row(" S2", "sample ")
		tab, err := ReadTableBytes("runsheet.csv", s.encode(t, text))
		if err != nil {
			t.Fatalf("%v: %v", s, err)
		}
		if tab.Delimiter != s.delim || !strings.HasPrefix(s.enc, tab.Encoding) && !strings.HasPrefix(s.enc, "Windows") || !slices.Equal(tab.Header, []string{"id", "kind", "scans", "path"}) || tab.HeadLine != 1 {
			t.Errorf("%v: taken for %q %s, header %q", s, tab.Delimiter, tab.Encoding, tab.Header)
		}
		if !slices.EqualFunc(tab.Rows, want, func(a, b Record) bool { return a.Line == b.Line && slices.Equal(a.Cells, b.Cells) }) {
			t.Errorf("%v: %v", s, tab.Rows)
		}
	}
}

func TestTableEdges(t *testing.T) {
	tab, err := ReadTableBytes("t.csv", []byte("\n\nid\nS1\nS2,extra\n"))
	if err != nil || tab.HeadLine != 3 || len(tab.Rows) != 2 || tab.Rows[1].Line != 5 || len(tab.Rows[1].Cells) != 2 {
		t.Errorf("%+v, %v", tab, err)
	}
	if c, ok := tab.Col("ID"); !ok || c != 0 {
		t.Error("Col does not find a column whatever its case")
	}
	// A header that holds both marks: the one that cuts more often separates.
	tab, err = ReadTableBytes("t.csv", []byte("id;conc:A [mg/L, dry];kind\nS1;1,5;sample\n"))
	if err != nil || len(tab.Header) != 3 || tab.Rows[0].Cells[1] != "1,5" {
		t.Errorf("%+v, %v", tab, err)
	}
	for text, want := range map[string][]string{
		"":                               {"t.csv: is empty"},
		"id,kind\n\"S1,sample\n":         {"t.csv:2:", "quoted cell"},
		"id,kind\nS\"1,sample\n":         {"t.csv:2:", "quotation mark"},
		"id,kind\x00\nS1,sample\n":       {"t.csv:1:", "NUL"},
		"PK\x03\x04":                     {"t.csv:", ".xlsx"},
		strings.Repeat("a,", 6000) + "b": {"t.csv:1: more than 5000 columns"},
		strings.Repeat("a,", 4999) + "b" + strings.Repeat("\nx", 1000): {"more than 4000000 cells"},
	} {
		_, err := ReadTableBytes("t.csv", []byte(text))
		for _, w := range want {
			if err == nil || !strings.Contains(err.Error(), w) {
				t.Errorf("%.20q: %v lacks %q", text, err, w)
			}
		}
	}
}

// sheet makes a workbook with excelize, an implementation other than the reader.
func sheet(t testing.TB, fill func(f *excelize.File)) []byte {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	fill(f)
	var b bytes.Buffer
	if err := f.Write(&b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func set(t testing.TB, f *excelize.File, cell string, v any) {
	t.Helper()
	if err := f.SetCellValue("Sheet1", cell, v); err != nil {
		t.Fatal(err)
	}
}

func TestBook(t *testing.T) {
	data := sheet(t, func(f *excelize.File) {
		for i, h := range []string{"id", "measured", "dilution", "site"} {
			set(t, f, fmt.Sprintf("%c2", 'A'+i), h)
		}
		set(t, f, "A4", "007")
		set(t, f, "B4", time.Date(2026, 5, 3, 0, 0, 0, 0, time.UTC))
		set(t, f, "C4", 0.1)
		set(t, f, "D4", true)
		set(t, f, "A5", 12)
		set(t, f, "B5", time.Date(2026, 5, 3, 14, 5, 7, 0, time.UTC))
		if err := f.SetCellFormula("Sheet1", "C5", "5*2"); err != nil {
			t.Fatal(err)
		}
		set(t, f, "C6", 1e-9)
		set(t, f, "A6", "S <6> & é")
		if err := f.SetCellRichText("Sheet1", "D6", []excelize.RichTextRun{{Text: "upper "}, {Text: "weir", Font: &excelize.Font{Bold: true}}}); err != nil {
			t.Fatal(err)
		}
		if err := f.SetRowVisible("Sheet1", 6, false); err != nil {
			t.Fatal(err)
		}
		if _, err := f.NewSheet("Other"); err != nil {
			t.Fatal(err)
		}
	})
	// excelize stores no result beside a formula: put in what a spreadsheet
	// program would.
	data = edit(t, data, "xl/worksheets/sheet1.xml", `<f>5*2</f>`, `<f>5*2</f><v>10</v>`)
	tab, err := ReadTableBytes("runsheet.xlsx", data)
	if err != nil {
		t.Fatal(err)
	}
	want := []Record{{4, []string{"007", "2026-05-03", "0.1", "TRUE"}}, {5, []string{"12", "2026-05-03T14:05:07", "10", ""}}, {6, []string{"S <6> & é", "", "0.000000001", "upper weir"}}}
	want[2].Cells[2] = "1e-09"
	if tab.HeadLine != 2 || !slices.EqualFunc(tab.Rows, want, func(a, b Record) bool { return a.Line == b.Line && slices.Equal(a.Cells, b.Cells) }) {
		t.Errorf("%v", tab.Rows)
	}
	if len(tab.Notes) != 1 || tab.Notes[0].Test != "sheet-hidden" || tab.Notes[0].Value != 1 || tab.Notes[0].Line != 6 {
		t.Errorf("notes %+v", tab.Notes)
	}
}

func TestBookRefusals(t *testing.T) {
	plain := sheet(t, func(f *excelize.File) { set(t, f, "A1", "id"); set(t, f, "A2", "S1") })
	part := "xl/worksheets/sheet1.xml"
	for _, c := range []struct {
		what string
		data []byte
		want []string
	}{
		{"empty", nil, []string{"r.xlsx: is empty"}},
		{"not a zip", []byte("PK\x03\x04junk"), []string{"r.xlsx: is no .xlsx"}},
		{"password", []byte("\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"), []string{"password"}},
		{"cut short", plain[:len(plain)/2], []string{"r.xlsx:"}},
		{"blank sheet", sheet(t, func(*excelize.File) {}), []string{"is empty"}},
		{"merged", sheet(t, func(f *excelize.File) {
			set(t, f, "A1", "id")
			if err := f.MergeCell("Sheet1", "A3", "A5"); err != nil {
				t.Fatal(err)
			}
		}), []string{"r.xlsx: Sheet1!A3:A5: merged cells", "unmerge"}},
		{"error value", edit(t, plain, part, `t="s"><v>1</v>`, `t="e"><v>#DIV/0!</v>`), []string{"Sheet1!A2: #DIV/0!", "repair"}},
		{"formula without result", sheet(t, func(f *excelize.File) {
			set(t, f, "A1", "id")
			if err := f.SetCellFormula("Sheet1", "B7", "1+1"); err != nil {
				t.Fatal(err)
			}
		}), []string{"Sheet1!B7: a formula without a stored result"}},
		{"text that is not there", edit(t, plain, part, `<v>1</v>`, `<v>77</v>`), []string{"Sheet1!A2: refers to a text"}},
		{"far column", edit(t, plain, part, `r="A2"`, `r="XFD2"`), []string{"Sheet1!XFD2: a cell beyond 5000 columns"}},
		{"no part", edit(t, plain, "xl/_rels/workbook.xml.rels", "worksheets/sheet1.xml", "worksheets/sheet9.xml"), []string{"lacks its part xl/worksheets/sheet9.xml"}},
		{"bad xml", edit(t, plain, part, "</sheetData>", "</sheetDat>"), []string{"sheet Sheet1:"}},
		{"zip bomb", bomb(t, plain, part, 65<<20), []string{"unpacks to more than 64 MB"}},
	} {
		_, err := ReadTableBytes("r.xlsx", c.data)
		for _, w := range c.want {
			if err == nil || !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %v lacks %q", c.what, err, w)
			}
		}
	}
}

// edit replaces text in one part of a workbook.
func edit(t testing.TB, data []byte, part, old, new string) []byte {
	t.Helper()
	return repack(t, data, func(name string, b []byte) []byte {
		if name != part {
			return b
		}
		if !bytes.Contains(b, []byte(old)) {
			t.Fatalf("%s holds no %s: %s", part, old, b)
		}
		return bytes.Replace(b, []byte(old), []byte(new), 1)
	})
}

// bomb appends n blanks to a part.
func bomb(t testing.TB, data []byte, part string, n int) []byte {
	return repack(t, data, func(name string, b []byte) []byte {
		if name != part {
			return b
		}
		return append(bytes.Clone(b), bytes.Repeat([]byte(" "), n)...)
	})
}

func repack(t testing.TB, data []byte, change func(name string, b []byte) []byte) []byte {
	t.Helper()
	r, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	w := zip.NewWriter(&out)
	for _, f := range r.File {
		in, err := f.Open()
		if err != nil {
			t.Fatal(err)
		}
		var b bytes.Buffer
		if _, err := b.ReadFrom(in); err != nil {
			t.Fatal(err)
		}
		p, err := w.Create(f.Name)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := p.Write(change(f.Name, b.Bytes())); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return out.Bytes()
}

// Dates as ECMA-376 part 1, 18.17.4.1, gives them for both calendars.
func TestDateText(t *testing.T) {
	for _, c := range []struct {
		x      float64
		from04 bool
		want   string
	}{
		{1, false, "1900-01-01"}, {59, false, "1900-02-28"}, {61, false, "1900-03-01"}, {36526, false, "2000-01-01"}, {2958465, false, "9999-12-31"},
		{0, true, "1904-01-01"}, {35064, true, "2000-01-01"}, {0.5, false, "12:00:00"}, {36526.75, false, "2000-01-01T18:00:00"}, {36526.999999, false, "2000-01-02"},
	} {
		if got, ok := dateText(c.x, c.from04); !ok || got != c.want {
			t.Errorf("%g: %s %v, want %s", c.x, got, ok, c.want)
		}
	}
	for _, x := range []float64{-1, 60, 60.5, 3e6} {
		if got, ok := dateText(x, false); ok {
			t.Errorf("%g: %s", x, got)
		}
	}
	for code, want := range map[string]bool{"yyyy\\-mm\\-dd": true, "General": false, "0.00": false, `"days" 0`: false, "[h]:mm": true, "[Red]0.0;[Blue]0": false, "d.m.yy": true, "#,##0 \"mg\"": false, "0;d": false, "0.00E+00": false, "_-* #,##0": false} {
		if dateCode(code) != want {
			t.Errorf("%s: %v", code, !want)
		}
	}
}
