package report

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/xuri/excelize/v2"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// largeSurvey is a survey of n bottles with few cells each: all that makes the rows
// of workbooks, one bottle in five with a long doubt.
func largeSurvey(t testing.TB, n int) string {
	dir := t.TempDir()
	f := newFixture(t, n, "parafac")
	f.grid = eem.Grid{Ex: axis(t, 240, 465, 25), Em: axis(t, 290, 590, 20)}
	f.write(t, dir)
	flags, err := ReadTable(filepath.Join(dir, "flags.csv"))
	must(t, err)
	budget := New("budget.csv")
	for i := range n {
		if i%5 == 0 {
			put(flags, f.id(i), "2031-05-03", "", "parafac", "unexplained", eem.Doubt, 0.88, 0.9,
				"the model explains 88 % of the signal; the residual is largest at ex 260 / em 366 nm: something in this bottle is not in the model", "", "")
		}
		for _, name := range fixtureNames {
			for k, cause := range []string{"noise", "blank", "intensity scale", "inner filter", "loadings", "dilution"} {
				put(budget, f.id(i), name, "parafac", cause, "cell", 0.01/float64(k+1), "RU", 40.0/float64(k+1), 5.0, "")
			}
		}
	}
	must(t, flags.WriteFile(dir))
	must(t, budget.WriteFile(dir))
	return dir
}

// Workbooks of many rows are written within seconds and are whole. TARNLIGHT_ROWS=5000
// measures that many instead of 300.
func TestManyRows(t *testing.T) {
	testkit.Heavy(t)
	n := 300
	if s := os.Getenv("TARNLIGHT_ROWS"); s != "" {
		var err error
		n, err = strconv.Atoi(s)
		must(t, err)
	}
	dir := largeSurvey(t, n)
	s := testSettings()
	s.Digits, s.Pictures, s.Workers = 2, false, 2
	r, err := loadResults(dir, &s)
	must(t, err)
	defer r.close()
	p, err := r.walk(context.Background(), func(int, string) {})
	must(t, err)
	for name, write := range map[string]func() error{"report.xlsx": r.writeClient, "workings.xlsx": func() error { return r.writeWorkings(p) }} {
		start := time.Now()
		must(t, write())
		took := time.Since(start)
		info, err := os.Stat(filepath.Join(dir, name))
		must(t, err)
		t.Logf("%s: %d bottles in %.1f s, %.1f MB", name, n, took.Seconds(), float64(info.Size())/1e6)
		if limit := 10*time.Second + time.Duration(n)*6*time.Millisecond; took > limit {
			t.Errorf("%s took %s, more than %s", name, took, limit)
		}
		wellMade(t, filepath.Join(dir, name))
	}
	x, err := excelize.OpenFile(filepath.Join(dir, "report.xlsx"))
	must(t, err)
	defer x.Close()
	rows, err := x.GetRows("Results")
	must(t, err)
	if want := n + 4; len(rows) != want || !strings.HasPrefix(rows[n-1][0], fmt.Sprintf("TL-%04d", n-4)) {
		t.Errorf("%d rows, want %d; row %d begins with %q", len(rows), want, n, rows[n-1][0])
	}
}
