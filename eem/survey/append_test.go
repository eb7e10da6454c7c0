package survey

import (
	"archive/zip"
	"bytes"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
)

func addedRows(ids ...string) []Row {
	var rows []Row
	for _, id := range ids {
		r := NewRow()
		r.ID, r.Kind, r.Scans, r.Absorbance = id, Sample, "scans/"+id, "absorbance/"+id+".csv"
		r.Measured, _ = parseTime("2031-05-09")
		rows = append(rows, r)
	}
	return rows
}

// In every delimiter, encoding and line end, with and without a last line end: the
// old bytes stand first, the new rows follow in the manner of the sheet, and cells
// that hold the delimiter or quotes come back as they were.
func TestAppendCSV(t *testing.T) {
	utf16 := func(o unicode.Endianness) func(string) string {
		return func(s string) string {
			out, err := unicode.UTF16(o, unicode.UseBOM).NewEncoder().String(s)
			must(t, err)
			return out
		}
	}
	latin := func(s string) string {
		out, err := charmap.Windows1252.NewEncoder().String(s)
		must(t, err)
		return out
	}
	rows := addedRows("Mühle 3", `odd "b", c; d`)
	for name, encode := range map[string]func(string) string{
		"UTF-8":        func(s string) string { return s },
		"UTF-8 mark":   func(s string) string { return "\ufeff" + s },
		"UTF-16 LE":    utf16(unicode.LittleEndian),
		"UTF-16 BE":    utf16(unicode.BigEndian),
		"Windows-1252": latin,
	} {
		for _, delim := range []string{",", ";", "\t"} {
			for _, end := range []string{"\n", "\r\n", "\r"} {
				for _, last := range []string{"", end, end + end} {
					text := strings.Join([]string{"id,kind,scans,measured,Prüfer,absorbance", "A1,sample,scans/A1,2031-05-06,Ö,"}, end) + last
					text = strings.ReplaceAll(text, ",", delim)
					data := []byte(encode(text))
					out, err := Append("runsheet.csv", data, nil, rows)
					if err != nil {
						t.Fatalf("%s %q %q %q: %v", name, delim, end, last, err)
					}
					if !bytes.HasPrefix(out, data) {
						t.Fatalf("%s %q %q %q: the old bytes changed", name, delim, end, last)
					}
					s, err := ParseSheet("runsheet.csv", out, Default())
					must(t, err)
					if len(s.Rows) != 3 || s.Rows[2].ID != rows[1].ID || s.Rows[1].Measured.Day() != "2031-05-09" || s.Rows[0].Cells[4] != "Ö" {
						t.Fatalf("%s %q %q %q: %+v", name, delim, end, last, s.Rows)
					}
					other := map[string]string{"\n": "\r", "\r": "\n", "\r\n": ""}[end]
					if plain := strings.ReplaceAll(string(out), "\x00", ""); other != "" && strings.Contains(plain, other) {
						t.Fatalf("%s %q: another line end in %q", name, end, plain)
					}
				}
			}
		}
	}
}

// What cannot be added without a change to the sheet, or would spoil it, is refused.
func TestAppendRefuses(t *testing.T) {
	const head = "id,kind,scans\nA1,sample,scans/A1\n"
	for _, c := range []struct{ text, id, want string }{
		{head, "A1", "runsheet.csv:3: id"},
		{head, "a1", "only in case"},
		{head + "\x1a", "A2", "end-of-file mark"},
		{"id,kind,scans\nM\xfchle,sample,scans/A1\n", "水", "UTF-8"},
		{"kind,scans\nsample,scans/A1\n", "A2", "id"},
	} {
		if _, err := Append("runsheet.csv", []byte(c.text), nil, addedRows(c.id)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: %v, want %q", c.text, err, c.want)
		}
	}
}

// A workbook that a person works in: filter, colours, conditional format, list of
// kinds, comment, frozen header, a second sheet with a formula, empty rows that were
// formatted once. Rows come behind the last one with content; every other part of
// the archive keeps its bytes, and every byte of the old rows stands.
func TestAppendXLSX(t *testing.T) {
	data := usedWorkbook(t)
	out, err := Append("runsheet.xlsx", data, nil, addedRows("001", "5 & <b>"))
	must(t, err)
	before, after := parts(t, data), parts(t, out)
	if len(before) != len(after) {
		t.Fatalf("%d parts became %d", len(before), len(after))
	}
	for name, text := range before {
		if name == "xl/worksheets/sheet1.xml" {
			_, rows, _ := strings.Cut(text, "<sheetData>")
			first, _, _ := strings.Cut(rows, `<row r="4"`)
			_, rest, _ := strings.Cut(text, "</sheetData>")
			rest = strings.Replace(rest, `<autoFilter ref="A1:F3"`, `<autoFilter ref="A1:F5"`, 1)
			if !strings.Contains(after[name], "<sheetData>"+first) || !strings.HasSuffix(after[name], "</sheetData>"+rest) {
				t.Errorf("the sheet was changed:\n%s\n%s", text, after[name])
			}
			continue
		}
		if name == "xl/workbook.xml" {
			text = strings.Replace(text, "$A$1:$F$3<", "$A$1:$F$5<", 1)
		}
		if after[name] != text {
			t.Errorf("%s was changed", name)
		}
	}
	f, err := excelize.OpenReader(bytes.NewReader(out))
	must(t, err)
	defer f.Close()
	for at, want := range map[string]string{"A2": "A1", "A4": "001", "B4": "sample", "C5": "scans/5 & <b>", "D4": "2031-05-09", "A6": ""} {
		if got, err := f.GetCellValue("bottles", at); err != nil || got != want {
			t.Errorf("%s is %q, want %q (%v)", at, got, want, err)
		}
	}
	yellow, err := f.GetCellStyle("bottles", "A2")
	must(t, err)
	grey, err := f.GetCellStyle("bottles", "A4") // the empty row that was formatted
	must(t, err)
	if a, err := f.GetStyle(yellow); err != nil || len(a.Fill.Color) != 1 || a.Fill.Color[0] != "FFFF00" {
		t.Errorf("A2 lost its colour: %+v %v", a, err)
	}
	if a, err := f.GetStyle(grey); err != nil || len(a.Fill.Color) != 1 || a.Fill.Color[0] != "CCCCCC" {
		t.Errorf("A4 is not in the format of its row: %+v %v", a, err)
	}
	if l, err := f.GetDataValidations("bottles"); err != nil || len(l) != 1 {
		t.Errorf("list of kinds: %v %v", l, err)
	}
	if c, err := f.GetConditionalFormats("bottles"); err != nil || len(c) != 1 {
		t.Errorf("conditional formats: %v %v", c, err)
	}
	if c, err := f.GetComments("bottles"); err != nil || len(c) != 1 || c[0].Cell != "B2" {
		t.Errorf("comments: %v %v", c, err)
	}
	if v, err := f.GetCellFormula("notes", "A1"); err != nil || v != "COUNTA(bottles!A:A)" {
		t.Errorf("formula of the second sheet: %q %v", v, err)
	}
}

// usedWorkbook has its content in rows 1 to 3 and formatted empty rows 4 and 9.
func usedWorkbook(t *testing.T) []byte {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	must(t, f.SetSheetName("Sheet1", "bottles"))
	for i, row := range [][]any{{"id", "kind", "scans", "measured", "absorbance", "remark"}, {"A1", "sample", "scans/A1", "2031-05-06", "", "brown"},
		{"B1", "blank", "scans/B1", "2031-05-06", "", ""}} {
		must(t, f.SetSheetRow("bottles", fmt.Sprintf("A%d", i+1), &row))
	}
	fill := func(colour, from, to string) {
		id, err := f.NewStyle(&excelize.Style{Fill: excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{colour}}})
		must(t, err)
		must(t, f.SetCellStyle("bottles", from, to, id))
	}
	fill("FFFF00", "A2", "F2")
	fill("CCCCCC", "A4", "F4")
	fill("CCCCCC", "A9", "F9")
	must(t, f.AutoFilter("bottles", "A1:F3", nil))
	v := excelize.NewDataValidation(true)
	v.Sqref = "B2:B500"
	must(t, v.SetDropList([]string{"sample", "blank"}))
	must(t, f.AddDataValidation("bottles", v))
	bold, err := f.NewConditionalStyle(&excelize.Style{Font: &excelize.Font{Bold: true}})
	must(t, err)
	must(t, f.SetConditionalFormat("bottles", "A2:A500", []excelize.ConditionalFormatOptions{{Type: "duplicate", Criteria: "=", Format: &bold}}))
	must(t, f.AddComment("bottles", excelize.Comment{Cell: "B2", Author: "lab", Text: "ask again"}))
	must(t, f.SetPanes("bottles", &excelize.Panes{Freeze: true, YSplit: 1, TopLeftCell: "A2", ActivePane: "bottomLeft"}))
	_, err = f.NewSheet("notes")
	must(t, err)
	must(t, f.SetCellFormula("notes", "A1", "COUNTA(bottles!A:A)"))
	b, err := f.WriteToBuffer()
	must(t, err)
	return b.Bytes()
}

func parts(t *testing.T, data []byte) map[string]string {
	t.Helper()
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	must(t, err)
	out := map[string]string{}
	for _, f := range z.File {
		r, err := f.Open()
		must(t, err)
		b, err := io.ReadAll(r)
		must(t, err)
		must(t, r.Close())
		out[f.Name] = string(b)
	}
	return out
}

// The list as a table: it takes the new rows in, and its own filter with it; also
// where it ended in empty rows that are filled now. One beside it, one with a row of
// totals and one on another sheet stay as they are.
func TestAppendToTable(t *testing.T) {
	for _, c := range []struct{ before, after string }{{"A1:C3", "A1:C5"}, {"A1:C4", "A1:C5"}, {"A1:C9", "A1:C9"}} {
		f := excelize.NewFile()
		for i, row := range [][]any{{"id", "kind", "scans", "remark", "code"}, {"A1", "sample", "scans/A1", "", "x"}, {"B1", "blank", "scans/B1", "", "y"}} {
			must(t, f.SetSheetRow("Sheet1", fmt.Sprintf("A%d", i+1), &row))
		}
		must(t, f.AddTable("Sheet1", &excelize.Table{Range: c.before, Name: "bottles", StyleName: "TableStyleLight9"}))
		must(t, f.AddTable("Sheet1", &excelize.Table{Range: "E1:E3", Name: "codes"}))
		_, err := f.NewSheet("more")
		must(t, err)
		must(t, f.AddTable("more", &excelize.Table{Range: "A1:B3", Name: "other"}))
		b, err := f.WriteToBuffer()
		must(t, err)
		must(t, f.Close())
		out, err := Append("runsheet.xlsx", b.Bytes(), nil, addedRows("N1", "N2"))
		must(t, err)
		g, err := excelize.OpenReader(bytes.NewReader(out))
		must(t, err)
		var got []string
		for _, sheet := range []string{"Sheet1", "more"} {
			list, err := g.GetTables(sheet)
			must(t, err)
			for _, x := range list {
				got = append(got, x.Name+" "+x.Range)
			}
		}
		must(t, g.Close())
		slices.Sort(got)
		if want := []string{"bottles " + c.after, "codes E1:E3", "other A1:B3"}; !slices.Equal(got, want) {
			t.Errorf("tables %v, want %v", got, want)
		}
		for name, text := range parts(t, out) {
			if strings.HasPrefix(name, "xl/tables/") && strings.Contains(text, `name="bottles"`) && strings.Count(text, `ref="`+c.after+`"`) != 2 {
				t.Errorf("table and its filter: %s", text)
			}
		}
	}
	total := []byte(`<table ref="A1:C3" totalsRowCount="1"><autoFilter ref="A1:C2"/></table>`)
	if got, err := (stretch{3, 5, 1}).tags(total, "table", "autoFilter"); err != nil || !bytes.Equal(got, total) {
		t.Errorf("a table with totals: %s, %v", got, err)
	}
}

// Workbooks of other programs: one that LibreOffice wrote, and one whose elements
// have a prefix.
func TestAppendOtherXLSX(t *testing.T) {
	data, err := os.ReadFile(testdata + "/formulas.xlsx")
	must(t, err)
	out, err := Append("runsheet.xlsx", data, twoSetups(), addedRows("N1", "N2"))
	must(t, err)
	s, err := ParseSheet("runsheet.xlsx", out, twoSetups())
	must(t, err)
	if len(s.Rows) != 5 || s.Rows[4].ID != "N2" || s.Rows[1].Dilution != 10 {
		t.Errorf("rows %+v", s.Rows)
	}
	plain := plainBook(t, bookRows("id,kind,scans", "A1,sample,a"))
	prefixed := bytes.Buffer{}
	w := zip.NewWriter(&prefixed)
	for name, text := range parts(t, plain) {
		if name == "xl/sheet.xml" {
			text = strings.NewReplacer("xmlns=", "xmlns:x=", "</", "</x:", "<", "<x:").Replace(text)
		}
		p, err := w.Create(name)
		must(t, err)
		_, err = io.WriteString(p, text)
		must(t, err)
	}
	must(t, w.Close())
	out, err = Append("runsheet.xlsx", prefixed.Bytes(), nil, addedRows("N1"))
	must(t, err)
	if s, err := ParseSheet("runsheet.xlsx", out, Default()); err != nil || len(s.Rows) != 2 || s.Rows[1].ID != "N1" {
		t.Errorf("with a prefix: %+v %v", s, err)
	}
}

// A path stands in a cell as it is, or as a pattern that finds it.
func TestCells(t *testing.T) {
	for path, want := range map[string]bool{"scans/Mühle 3.csv": true, "a b/c.csv": true, " a.csv": false, "a\u00a0b": false, `a\b`: false,
		"a\nb": false, "a\xffb": false, "../a": false, "": false, "[1].csv": true} {
		if got := PlainCell(path); got != want {
			t.Errorf("PlainCell(%q) = %v", path, got)
		}
	}
	for _, c := range [][2]string{{"a[1]*?.csv", "a[[]1][*][?].csv"}, {" a\u00a0b\\c\n", "?a?b?c?"}, {"a\xffb", "a?b"}} {
		if path, want := c[0], c[1]; PatternOf(path) != want {
			got := PatternOf(path)
			t.Errorf("PatternOf(%q) = %q, want %q", path, got, want)
		}
	}
}
