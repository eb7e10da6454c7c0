package survey

import (
	"bytes"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/xuri/excelize/v2"

	"tarnlight/eem/scanfile"
)

// readTable is ReadSheet on bytes.
func readTable(name string, data []byte) (*Sheet, error) {
	t, err := scanfile.ReadTableBytes(name, data)
	if err != nil {
		return nil, err
	}
	return sheetOf(t, nil, twoSetups())
}

// sameAgain reads a run sheet and finds the rows of s in it.
func sameAgain(t *testing.T, s *Sheet, name string, data []byte) {
	t.Helper()
	got, err := readTable(name, data)
	if err != nil {
		t.Fatalf("%v\n%q", err, data)
	}
	if d := cmp.Diff(s.Rows, got.Rows, cmpopts.EquateNaNs(), cmpopts.IgnoreFields(Row{}, "Cells", "Line")); d != "" {
		t.Fatalf("written and read (-want +got):\n%s", d)
	}
}

// fullDraft is the sheet with every column and kind.
func fullDraft(t *testing.T) *Sheet {
	t.Helper()
	s, err := ReadSheet(folder(t, map[string]string{"runsheet.csv": fullSheet}), twoSetups())
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestWriteSheet(t *testing.T) {
	s := fullDraft(t)
	bare := &Sheet{Rows: s.Rows} // no columns: those that are known
	for _, w := range []*Sheet{s, bare} {
		var c, x, again bytes.Buffer
		if err := WriteSheetCSV(&c, w); err != nil {
			t.Fatal(err)
		}
		sameAgain(t, s, "runsheet.csv", c.Bytes())
		if err := WriteSheetXLSX(&x, w); err != nil {
			t.Fatal(err)
		}
		sameAgain(t, s, "runsheet.xlsx", x.Bytes())
		if err := WriteSheetXLSX(&again, w); err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(x.Bytes(), again.Bytes()) {
			t.Error("the same sheet gave different bytes")
		}
	}
	// what is carried along comes back too
	var c bytes.Buffer
	if err := WriteSheetCSV(&c, s); err != nil {
		t.Fatal(err)
	}
	got, err := ReadSheet(folder(t, map[string]string{"runsheet.csv": c.String()}), twoSetups())
	if err != nil {
		t.Fatal(err)
	}
	if last := got.Rows[2].Cells[21]; last != "two\nlines" {
		t.Errorf("the carried cell became %q", last)
	}
}

// TestDraftedWorkbook: what a person sees who fills in the workbook.
func TestDraftedWorkbook(t *testing.T) {
	r := NewRow()
	r.ID, r.Kind, r.Scans, r.Dilution = "001", Sample, "scans/001", 2.5
	s := &Sheet{Rows: []Row{r}}
	var b bytes.Buffer
	if err := WriteSheetXLSX(&b, s); err != nil {
		t.Fatal(err)
	}
	f, err := excelize.OpenReader(&b)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	name := f.GetSheetName(0)
	for cell, want := range map[string]string{"A1": "id", "A2": "001", "B2": "sample", "L1": "dilution", "L2": "2.5"} {
		if got, err := f.GetCellValue(name, cell, excelize.Options{RawCellValue: true}); err != nil || got != want {
			t.Errorf("%s holds %q, %v; want %q", cell, got, err, want)
		}
	}
	for cell, want := range map[string]excelize.CellType{"A2": excelize.CellTypeSharedString, "L2": excelize.CellTypeUnset} {
		if got, err := f.GetCellType(name, cell); err != nil || got != want {
			t.Errorf("%s is of type %v, %v; want %v", cell, got, err, want)
		}
	}
	for _, cell := range []string{"A2", "A900"} { // 900: the column's own style
		id, err := f.GetCellStyle(name, cell)
		if err != nil {
			t.Fatal(err)
		}
		if style, err := f.GetStyle(id); err != nil || style.NumFmt != 49 {
			t.Errorf("%s has number format %d, %v; want text (49)", cell, style.NumFmt, err)
		}
	}
	lists, err := f.GetDataValidations(name)
	if err != nil || len(lists) != 1 || lists[0].Sqref != "B2:B2001" || !strings.Contains(lists[0].Formula1, "sample,blank,field-blank,standard,control,spike") {
		t.Errorf("list of kinds: %+v, %v", lists, err)
	}
	if p, err := f.GetPanes(name); err != nil || !p.Freeze || p.YSplit != 1 {
		t.Errorf("panes %+v, %v", p, err)
	}
	if w, err := f.GetColWidth(name, "C"); err != nil || w < 30 {
		t.Errorf("scans are %g wide, %v", w, err)
	}
	r.Scans = strings.Repeat("x", maxCell+1)
	if err := WriteSheetXLSX(&b, &Sheet{Rows: []Row{r}}); err == nil {
		t.Error("a cell that would be cut was written")
	}
}

// workbook writes a runsheet.xlsx with the cells given and returns its folder.
func workbook(t *testing.T, cells map[string]any, change func(f *excelize.File, sheet string)) string {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	for at, v := range cells {
		if err := f.SetCellValue("Sheet1", at, v); err != nil {
			t.Fatal(err)
		}
	}
	if change != nil {
		change(f, "Sheet1")
	}
	dir := t.TempDir()
	if err := f.SaveAs(filepath.Join(dir, "runsheet.xlsx")); err != nil {
		t.Fatal(err)
	}
	return dir
}
