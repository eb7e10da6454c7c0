package report

import (
	"archive/zip"
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/xuri/excelize/v2"
)

// sheetOrder is the order in which the parts of a worksheet must come (ECMA-376 Part
// 1, 18.3.1.99, CT_Worksheet); those that we never write are left out.
var sheetOrder = []string{"sheetPr", "dimension", "sheetViews", "sheetFormatPr", "cols", "sheetData", "autoFilter", "mergeCells", "conditionalFormatting",
	"dataValidations", "hyperlinks", "printOptions", "pageMargins", "pageSetup", "headerFooter", "rowBreaks", "colBreaks", "drawing", "legacyDrawing", "tableParts", "extLst"}

// wellMade looks for what makes Excel offer to repair a workbook: XML that is not well
// formed, parts in a wrong order, cells out of order or too long, tables whose heads
// are not the cells above them, names given twice, merged cells that overlap, more
// styles than it takes.
func wellMade(t *testing.T, path string) {
	t.Helper()
	z, err := zip.OpenReader(path)
	must(t, err)
	defer z.Close()
	for _, part := range z.File {
		r, err := part.Open()
		must(t, err)
		data, err := io.ReadAll(r)
		must(t, err)
		if !strings.HasSuffix(part.Name, ".xml") && !strings.HasSuffix(part.Name, ".rels") {
			continue
		}
		if err := wellFormed(data, strings.HasPrefix(part.Name, "xl/worksheets/sheet")); err != nil {
			t.Errorf("%s: %s: %v", path, part.Name, err)
		}
		if part.Name == "xl/styles.xml" {
			if n := bytes.Count(data, []byte("<numFmt ")); n > 200 {
				t.Errorf("%s: %d number formats of our own", path, n)
			}
		}
	}
	f, err := excelize.OpenFile(path)
	must(t, err)
	defer f.Close()
	tables, names := map[string]bool{}, map[string]bool{}
	for _, d := range f.GetDefinedName() {
		if key := d.Name + " on " + d.Scope; names[key] {
			t.Errorf("%s: the name %s twice", path, key)
		} else {
			names[key] = true
		}
	}
	for _, sheet := range f.GetSheetList() {
		if utf8.RuneCountInString(sheet) > 31 {
			t.Errorf("%s: the name of sheet %s is too long", path, sheet)
		}
		list, err := f.GetTables(sheet)
		must(t, err)
		for _, x := range list {
			if tables[strings.ToLower(x.Name)] {
				t.Errorf("%s: two tables %s", path, x.Name)
			}
			tables[strings.ToLower(x.Name)] = true
			must(t, headsAreCells(f, sheet, x.Range))
		}
		merged, err := f.GetMergeCells(sheet)
		must(t, err)
		must(t, apart(merged))
	}
}

// wellFormed reads a part to its end; of a worksheet it looks at the order too.
func wellFormed(data []byte, worksheet bool) error {
	d, depth, at, row, cells := xml.NewDecoder(bytes.NewReader(data)), 0, 0, 0, 0
	for {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		switch e := tok.(type) {
		case xml.StartElement:
			depth++
			if !worksheet {
				continue
			}
			if depth == 2 {
				n := slices.Index(sheetOrder, e.Name.Local)
				if n < at {
					return fmt.Errorf("<%s> after <%s>", e.Name.Local, sheetOrder[at])
				}
				at = n
			}
			for _, a := range e.Attr {
				switch {
				case e.Name.Local == "row" && a.Name.Local == "r":
					var n int
					if _, err := fmt.Sscan(a.Value, &n); err != nil || n <= row {
						return fmt.Errorf("row %s after row %d", a.Value, row)
					}
					row, cells = n, 0
				case e.Name.Local == "c" && a.Name.Local == "r":
					x, y, err := excelize.CellNameToCoordinates(a.Value)
					if err != nil || y != row || x <= cells {
						return fmt.Errorf("cell %s in row %d, behind column %d: %w", a.Value, row, cells, err)
					}
					cells = x
				}
			}
		case xml.EndElement:
			depth--
		case xml.CharData:
			if n := utf8.RuneCount(e); worksheet && n > 32767 {
				return fmt.Errorf("a cell of %d letters", n)
			}
		}
	}
}

// headsAreCells holds the columns of a table against the cells of its first row.
func headsAreCells(f *excelize.File, sheet, ref string) error {
	from, to, _ := strings.Cut(ref, ":")
	x, y, err := excelize.CellNameToCoordinates(from)
	z, _, err2 := excelize.CellNameToCoordinates(to)
	seen := map[string]bool{}
	for ; x <= z; x++ {
		cell, _ := excelize.CoordinatesToCellName(x, y)
		text, err := f.GetCellValue(sheet, cell)
		if err != nil || text == "" || seen[strings.ToLower(text)] {
			return fmt.Errorf("%s!%s: head %q is empty or there twice: %w", sheet, cell, text, err)
		}
		seen[strings.ToLower(text)] = true
	}
	return errors.Join(err, err2)
}

// apart says whether merged cells overlap: they do where one begins in another.
func apart(merged []excelize.MergeCell) error {
	in := map[string]string{}
	for _, m := range merged {
		x, y, err := excelize.CellNameToCoordinates(m.GetStartAxis())
		z, w, err2 := excelize.CellNameToCoordinates(m.GetEndAxis())
		if err := errors.Join(err, err2); err != nil {
			return err
		}
		for r := y; r <= w; r++ {
			for c := x; c <= z; c++ {
				cell, _ := excelize.CoordinatesToCellName(c, r)
				if in[cell] != "" {
					return fmt.Errorf("%s is in %s and %s", cell, in[cell], m.GetStartAxis())
				}
				in[cell] = m.GetStartAxis()
			}
		}
	}
	return nil
}
