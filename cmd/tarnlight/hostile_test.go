package main

import (
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"unicode"

	"github.com/xuri/excelize/v2"
)

// Ids and comments that hold markup, formulas, quotes, line ends, marks that turn
// the direction and 10,000 characters come through the whole job as text: in the
// tables as they are, in workbooks and page harmless, in file names safe.
func TestHostileIDs(t *testing.T) {
	refused := []string{"=1+1", "+SUM(A1)", "-2", "@cmd", "two\nlines"} // as ids: run sheets are opened in spreadsheets
	evil := []string{"=1+1", "+SUM(A1)", "-2", "@cmd", `"><script>alert(1)</script>`, "two\nlines", "\u202efdp.exe", strings.Repeat("long", 2500), "{{.}}", "../../up", "CON", `a"b`, "it's"}
	y := newTiny()
	y.sheet[0] += ",comment"
	for i := 1; i < len(y.sheet); i++ {
		y.sheet[i] += ","
	}
	var ids []string
	comment := func(i int) string { return evil[(i+3)%len(evil)] }
	quote := func(s string) string { return `"` + strings.ReplaceAll(s, `"`, `""`) + `"` }
	for _, id := range refused {
		bad := newTiny()
		bad.sheet = append(bad.sheet, quote(id)+",sample,scans/W1.csv,2031-05-03,,,")
		if r := call("check", bad.write(t)).want(t, exitFailed); !strings.Contains(r.err, "runsheet.csv:8") {
			t.Errorf("%q as an id:\n%s", id, r.err)
		}
	}
	for i, id := range evil {
		if slices.Contains(refused, id) {
			id = "E" + id[1:2] + string(rune('a'+i))
		}
		ids = append(ids, id)
		file := "scans/e" + string(rune('a'+i)) + ".csv"
		y.files[file] = gridText(0.5+0.1*float64(i), 1)
		y.sheet = append(y.sheet, quote(id)+",sample,"+file+",2031-05-03,,,,"+quote(comment(i)))
	}
	y.settings = "title = \"=2+2\"\n" + y.settings + "\n[report]\nclient = \"<b>\\u202e\"\n"
	dir := y.write(t)
	call("run", dir).want(t, exitDone, exitDoubt)
	out := filepath.Join(dir, "out")
	s := table(t, out, "samples.csv")
	for i, id := range ids {
		if got := cell(t, s, "comment", "id", id); got != comment(i) {
			t.Errorf("%.20q: comment %.40q", id, got)
		}
	}
	maps, err := os.ReadDir(filepath.Join(out, "maps"))
	if err != nil || len(maps) != len(s.Rows) {
		t.Errorf("%d pictures of %d bottles, %v", len(maps), len(s.Rows), err)
	}
	for _, m := range maps {
		if strings.ContainsFunc(m.Name(), func(r rune) bool {
			return unicode.IsControl(r) || strings.ContainsRune(`<>:"/\|?*`, r) || unicode.Is(unicode.Cf, r)
		}) || len(m.Name()) > 200 {
			t.Errorf("file name %q", m.Name())
		}
	}
	for _, name := range []string{"report.xlsx", "workings.xlsx"} {
		noFormulas(t, filepath.Join(out, name))
	}
	page := read(t, out, "report.html")
	for _, bad := range []string{"<script>alert", "<b>", "\u202e"} {
		if strings.Contains(page, bad) {
			t.Errorf("the page holds %q as it is", bad)
		}
	}
	for _, id := range []string{ids[4], "\u202efdp.exe", strings.Repeat("long", 2500)} {
		if r := call("explain", out, id).want(t, exitDone); !strings.Contains(r.out, "survey.nc") {
			t.Errorf("explain %.20q:\n%.400s", id, r.out)
		}
	}
	call("verify", out).want(t, exitDone)
}

func noFormulas(t *testing.T, path string) {
	t.Helper()
	x, err := excelize.OpenFile(path)
	if err != nil {
		t.Fatal(err)
	}
	defer x.Close()
	for _, sheet := range x.GetSheetList() {
		rows, err := x.GetRows(sheet)
		if err != nil {
			t.Fatal(err)
		}
		for r := range rows {
			for c := range rows[r] {
				at, _ := excelize.CoordinatesToCellName(c+1, r+1)
				if formula, _ := x.GetCellFormula(sheet, at); formula != "" {
					t.Errorf("%s, %s!%s holds the formula %q", filepath.Base(path), sheet, at, formula)
				}
			}
		}
	}
}
