package report

import (
	"context"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

// What was rounded before the point (GUM 7.2.6: 68.3 with U = 213.2 is 70 ± 210) and
// what needs an exponent is shown alike in both spreadsheet programs and on the page,
// and the cells keep all digits.
func TestRoundedAlikeEverywhere(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	newFixture(t, 6, "parafac").write(t, dir)
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	set := func(i int, cells ...string) {
		for k := 0; k < len(cells); k += 2 {
			c.Rows[i][c.Col(cells[k])] = cells[k+1]
		}
	}
	// the first bottle's four components; as an older version rounded the first
	set(0, "value", "68.34", "standard_uncertainty", "106.6", "lower95", "0", "upper95", "277", "reported", "68", "qualifier", "J")
	set(1, "value", "0.1", "detection_limit", "213.2", "reported", "< 210", "qualifier", "U")
	set(2, "value", "9.123e-05", "standard_uncertainty", "1.23e-06", "lower95", "8.88e-05", "upper95", "9.36e-05", "reported", "9.12e-5", "qualifier", "")
	set(3, "value", "1234.5", "standard_uncertainty", "3.5", "lower95", "1223.3", "upper95", "1245.7", "reported", "1235", "qualifier", "")
	must(t, c.WriteFile(dir))
	s := testSettings()
	s.Pictures = false
	must(t, Render(context.Background(), dir, s, nil))

	f, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer f.Close()
	rows, err := f.GetRows("Results", excelize.Options{RawCellValue: true})
	must(t, err)
	first := slices.Index(rows[3], "1 Tryptophan-like, RU")
	for at, want := range map[int][2]string{0: {"68.34", `[<65]0;[>=75]0;"70"`}, 1: {"213.2", `[<205]0;[>=215]0;"210"`}, 3: {"213.2", `[<205]"< "0;[>=215]"< "0;"< 210"`},
		6: {"0.00009123", "0.00E+0"}, 9: {"1234.5", "0"}, 10: {"11.2000000000000", "0"}} {
		cell, _ := excelize.CoordinatesToCellName(first+at+1, 5)
		id, err := f.GetCellStyle("Results", cell)
		must(t, err)
		style, err := f.GetStyle(id)
		must(t, err)
		format := "0" // a built-in one
		if style.CustomNumFmt != nil {
			format = *style.CustomNumFmt
		}
		if rows[4][first+at] != want[0] || format != want[1] {
			t.Errorf("column %s of Results holds %s and shows it as %s, want %v", rows[3][first+at], rows[4][first+at], format, want)
		}
	}
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	must(t, err)
	for _, want := range []string{`["70","210","2.0","J`, `["\u003c 210","","","U`, `["9.12 · 10⁻⁵","2.5 · 10⁻⁶","2.0",`, `["1235","11","3.2",`} {
		if !strings.Contains(string(page), want) {
			t.Errorf("the page does not hold %s", want)
		}
	}
	office, err := exec.LookPath("soffice")
	if err != nil || testing.Short() {
		t.Skip("LibreOffice is not installed, or the run is short")
	}
	out, err := exec.Command(office, "-env:UserInstallation=file://"+t.TempDir(), "--headless", "--convert-to", "csv:Text - txt - csv (StarCalc):59,34,76,1,,0,false,true,true,false,false,2",
		"--outdir", dir, filepath.Join(dir, "report.xlsx")).CombinedOutput()
	if err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	shown, err := os.ReadFile(filepath.Join(dir, "report-Results.csv"))
	must(t, err)
	if want := ";70;210;J;< 210;;U;9.12E-5;2.5E-6;;1235;11;"; !strings.Contains(string(shown), want) {
		t.Errorf("LibreOffice does not show %s:\n%.600s", want, shown)
	}
}
