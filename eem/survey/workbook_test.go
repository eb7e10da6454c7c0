package survey

import (
	"archive/zip"
	"bytes"
	"io"
	"os"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

// TestWorkbook: what spreadsheets store in cells comes out as people see it.
func TestWorkbook(t *testing.T) {
	noon := time.Date(2026, 5, 3, 12, 30, 0, 0, time.UTC)
	cells := map[string]any{
		"A1": "id", "B1": "kind", "C1": "scans", "D1": "dilution", "E1": "measured", "F1": "conc:Trp [µg/L]", "G1": "sampled",
		"A2": 17, "B2": "standard", "C2": "a", "D2": 2.5, "E2": noon, "F2": 0.1,
		"A3": "001", "B3": "sample", "C3": "b", "D3": "2,5", "E3": "2026-05-03", "G3": time.Date(2026, 5, 1, 0, 0, 0, 0, time.UTC),
		"A5": "S5", "B5": "blank", "C5": "c",
		"A6": "S6", "B6": "standard", "C6": "d", "F6": 1,
	}
	dir := workbook(t, cells, nil)
	// a text "2,5" beside the number 2.5: two decimal marks in one sheet
	_, err := ReadSheet(dir, nil)
	if msg := message(err, dir); msg != `runsheet.xlsx:3: dilution: "2.5" has a decimal point and "2,5" a decimal comma; write all numbers of the sheet with one decimal mark, and no thousands marks` {
		t.Errorf("text beside numbers: %s", msg)
	}

	cells["D3"] = 10
	dir = workbook(t, cells, func(f *excelize.File, sheet string) {
		must(t, f.SetRowVisible(sheet, 5, false))
	})
	s, err := ReadSheet(dir, nil)
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Rows) != 4 {
		t.Fatalf("%d rows, want 4", len(s.Rows))
	}
	a, b, c := s.Rows[0], s.Rows[1], s.Rows[2]
	if a.ID != "17" || a.Line != 2 || a.Dilution != 2.5 || !a.Measured.Equal(noon) || a.Measured.DateOnly || a.Conc[0] != (Conc{"Trp", "µg/L", 0.1}) {
		t.Errorf("row 2: %+v", a)
	}
	if b.ID != "001" || b.Dilution != 10 || b.Measured.Day() != "2026-05-03" || !b.Sampled.DateOnly || b.Sampled.Day() != "2026-05-01" {
		t.Errorf("row 3: %+v", b)
	}
	if c.ID != "S5" || c.Line != 5 {
		t.Errorf("row 5: %+v", c)
	}
	hidden := 0
	for _, n := range s.Notes {
		if n.Test == "sheet-hidden" {
			hidden++
		}
	}
	if hidden != 1 {
		t.Errorf("%d notes about hidden rows in %+v", hidden, s.Notes)
	}
}

// TestOtherSpreadsheet reads a workbook that LibreOffice made of formulas.csv, and
// finds what its formulas and dates amount to.
func TestOtherSpreadsheet(t *testing.T) {
	data, err := os.ReadFile(testdata + "/formulas.xlsx")
	must(t, err)
	s, err := readTable("runsheet.xlsx", data)
	must(t, err)
	if len(s.Rows) != 3 {
		t.Fatalf("%d rows, want 3", len(s.Rows))
	}
	w, a, b := s.Rows[0], s.Rows[1], s.Rows[2]
	if w.Measured.Text != "2026-05-03T09:30:00" || w.Measured.DateOnly {
		t.Errorf("measured %+v", w.Measured)
	}
	if a.Dilution != 10 || a.Conc[0].Value != 0.333 || a.Measured.Text != "2026-05-03" || a.Sampled.Text != "2026-05-01" {
		t.Errorf("T1: %+v", a)
	}
	if b.Dilution != 2.5 || b.Conc[0].Value != 0.666 || b.Site != "Mill weir" || b.Sampled.Day() != "2026-05-02" {
		t.Errorf("T2: %+v", b)
	}
}

// TestFormulas: the stored result of a formula counts, and an error value is an
// error. excelize stores no results, so that the cell is written as a spreadsheet
// would.
func TestFormulas(t *testing.T) {
	const sheetXML = `<c r="D2"><f>5*2</f><v>10</v></c>`
	dir := workbook(t, map[string]any{"A1": "id", "B1": "kind", "C1": "scans", "D1": "dilution",
		"A2": "S1", "B2": "sample", "C2": "a"}, func(f *excelize.File, sheet string) {
		must(t, f.SetCellFormula(sheet, "D2", "5*2"))
	})
	path := dir + "/runsheet.xlsx"
	replaceInZip(t, path, "xl/worksheets/sheet1.xml", func(xml string) string {
		i := strings.Index(xml, `<c r="D2"`)
		j := i + strings.Index(xml[i:], "</c>") + len("</c>")
		if i < 0 || j < i {
			t.Fatalf("no cell D2 in %s", xml)
		}
		return xml[:i] + sheetXML + xml[j:]
	})
	s, err := ReadSheet(dir, nil)
	if err != nil {
		t.Fatal(err)
	}
	if s.Rows[0].Dilution != 10 {
		t.Errorf("dilution %g; the formula's stored result is 10", s.Rows[0].Dilution)
	}
	replaceInZip(t, path, "xl/worksheets/sheet1.xml", func(xml string) string {
		return strings.Replace(xml, sheetXML, `<c r="D2" t="e"><f>1/0</f><v>#DIV/0!</v></c>`, 1)
	})
	_, err = ReadSheet(dir, nil)
	if msg := message(err, dir); !strings.HasPrefix(msg, "runsheet.xlsx: Sheet1!D2: ") || !strings.Contains(msg, "#DIV/0!") {
		t.Errorf("error value: %s", msg)
	}
}

func TestMergedCells(t *testing.T) {
	dir := workbook(t, map[string]any{"A1": "id", "B1": "kind", "C1": "scans", "A2": "S1", "B2": "sample", "C2": "a", "A3": "S2", "C3": "b"},
		func(f *excelize.File, sheet string) { must(t, f.MergeCell(sheet, "B2", "B3")) })
	_, err := ReadSheet(dir, nil)
	if msg := message(err, dir); !strings.HasPrefix(msg, "runsheet.xlsx: Sheet1!B2:B3: ") || !strings.Contains(msg, "unmerge") {
		t.Errorf("merged cells: %s", msg)
	}
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

// replaceInZip changes one part of a workbook.
func replaceInZip(t *testing.T, path, part string, change func(string) string) {
	t.Helper()
	r, err := zip.OpenReader(path)
	must(t, err)
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	for _, f := range r.File {
		in, err := f.Open()
		must(t, err)
		data, err := io.ReadAll(in)
		must(t, err)
		if f.Name == part {
			data = []byte(change(string(data)))
		}
		out, err := w.Create(f.Name)
		must(t, err)
		_, err = out.Write(data)
		must(t, err)
	}
	must(t, w.Close())
	must(t, r.Close())
	must(t, os.WriteFile(path, b.Bytes(), 0o600))
}

// plainBook packs a sheet's XML into the least workbook there can be (ECMA-376),
// so that a fuzzer spends its time on the sheet and not on the zip. Style 1 is a
// date.
func plainBook(t testing.TB, sheet string) []byte {
	const (
		ns   = ` xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"`
		rels = `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">`
		kind = `http://schemas.openxmlformats.org/officeDocument/2006/relationships/`
	)
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	for _, p := range [][2]string{
		{"_rels/.rels", rels + `<Relationship Id="r1" Type="` + kind + `officeDocument" Target="xl/workbook.xml"/></Relationships>`},
		{"xl/workbook.xml", `<workbook` + ns + `><sheets><sheet name="a" sheetId="1" r:id="r1"/></sheets></workbook>`},
		{"xl/_rels/workbook.xml.rels", rels + `<Relationship Id="r1" Type="` + kind + `worksheet" Target="sheet.xml"/>` +
			`<Relationship Id="r2" Type="` + kind + `styles" Target="styles.xml"/></Relationships>`},
		{"xl/styles.xml", `<styleSheet` + ns + `><cellXfs><xf numFmtId="0"/><xf numFmtId="22"/></cellXfs></styleSheet>`},
		{"xl/sheet.xml", `<worksheet` + ns + `><sheetData>` + sheet + `</sheetData></worksheet>`},
	} {
		out, err := w.CreateHeader(&zip.FileHeader{Name: p[0], Method: zip.Store})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(out, p[1]); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// bookRows writes rows of text cells as the XML of a sheet.
func bookRows(rows ...string) string {
	var b strings.Builder
	for _, r := range rows {
		b.WriteString("<row>")
		for _, c := range strings.Split(r, ",") {
			b.WriteString(`<c t="inlineStr"><is><t>` + c + `</t></is></c>`)
		}
		b.WriteString("</row>")
	}
	return b.String()
}

// FuzzSheetXLSX: no sheet of a workbook panics or hangs; one that is read can be
// written and read back as the same rows. Damaged archives are for eem/scanfile.
func FuzzSheetXLSX(f *testing.F) {
	head := bookRows("id,kind,scans,dilution,measured,conc:Trp [µg/L]")
	for _, s := range []string{
		head + bookRows("S1,sample,a,2.5,2026-05-03,"),
		head + `<row hidden="1"><c><v>17</v></c><c t="str"><f>A1</f><v>standard</v></c><c r="C2" t="inlineStr"><is><r><t>a</t></r></is></c><c r="E2" s="1"><v>46145.5</v></c><c r="F2"><v>1e-3</v></c></row>`,
		head + `<row r="9"><c t="e"><v>#N/A</v></c></row>`,
		head + bookRows("S1,blank,a") + `</sheetData><mergeCells><mergeCell ref="A1:A2"/></mergeCells><sheetData>`,
		"", "<row/>", "<row><unclosed>",
	} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, sheet string) {
		book := plainBook(t, sheet)
		var s *Sheet
		var err error
		testkit.Bounded(t, len(book)+len(sheet), func() { s, err = readTable("runsheet.xlsx", book) })
		if err != nil {
			if !strings.Contains(err.Error(), "runsheet.xlsx") {
				t.Fatalf("the message does not name the file: %v", err)
			}
			return
		}
		var b bytes.Buffer
		must(t, WriteSheetCSV(&b, s))
		sameAgain(t, s, "runsheet.csv", b.Bytes())
	})
}
