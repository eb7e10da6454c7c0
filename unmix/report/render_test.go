package report

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

func safeName(id string) string {
	sum := sha256.Sum256([]byte(id))
	return hex.EncodeToString(sum[:4])
}

func testSettings() RenderSettings {
	return RenderSettings{Title: "Upper Lindow, May survey", Client: "Lindow Rivers Board", Order: "LRB-31/07", Number: "R-2031-018",
		Method: "EEM fluorescence, house method F-12", Remarks: "Bottles were kept dark and cold.", TestedBy: "A. Fenn", ApprovedBy: "B. Holm",
		Pictures: true, SafeName: safeName}
}

// TestLook leaves a whole report where LOOK_AT says, for the eye.
func TestLook(t *testing.T) {
	dir := os.Getenv("LOOK_AT")
	if dir == "" {
		t.Skip("set LOOK_AT to a folder")
	}
	n := 36
	fmt.Sscan(os.Getenv("LOOK_N"), &n)
	methods := []string{"parafac"}
	if os.Getenv("LOOK_TWO") != "" {
		methods = []string{"references", "parafac"}
	}
	must(t, os.MkdirAll(dir, 0o777))
	newFixture(t, n, methods...).write(t, dir)
	must(t, Render(context.Background(), dir, testSettings(), func(d, n int, what string) {}))
	t.Log(filepath.Glob(dir + "/*"))
}

// rendered makes a report of n bottles and returns its folder.
func rendered(t testing.TB, n int, change func(*RenderSettings), methods ...string) string {
	t.Helper()
	dir := t.TempDir()
	newFixture(t, n, methods...).write(t, dir)
	s := testSettings()
	if change != nil {
		change(&s)
	}
	must(t, Render(context.Background(), dir, s, nil))
	return dir
}

// The spectra of a contaminated blank are drawn and stand beside the picture; a clean
// one is not drawn.
func TestBlankFigure(t *testing.T) {
	testkit.Heavy(t)
	dir := rendered(t, 3, nil, "parafac")
	svg, err := os.ReadFile(filepath.Join(dir, "figures", "blanks.svg"))
	must(t, err)
	if text := string(svg); !strings.Contains(text, "PW2, emission at ex 350 nm") || strings.Contains(text, "PW1, ") {
		t.Error("the picture does not show the contaminated blank alone")
	}
	num, err := ReadTable(filepath.Join(dir, "figures", "blanks.csv"))
	must(t, err)
	if len(num.Rows) < 100 || num.Text(0, num.Col("id")) != "PW2" {
		t.Errorf("%d rows", len(num.Rows))
	}
}

// hash of every file in a folder.
func hashes(t testing.TB, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	must(t, filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		b, err := os.ReadFile(path)
		rel, _ := filepath.Rel(dir, path)
		out[rel] = fmt.Sprintf("%x", sha256.Sum256(b))
		return err
	}))
	return out
}

// The same results give the same bytes, in every file, whatever the number of
// workers.
func TestSameBytes(t *testing.T) {
	one := hashes(t, rendered(t, 9, func(s *RenderSettings) { s.Workers = 1 }, "parafac"))
	four := hashes(t, rendered(t, 9, func(s *RenderSettings) { s.Workers = 4 }, "parafac"))
	if len(one) < 30 || len(one) != len(four) {
		t.Fatalf("%d and %d files", len(one), len(four))
	}
	for name, h := range one {
		if four[name] != h {
			t.Errorf("%s differs", name)
		}
	}
}

// Text from outside stays text: formulas, markup, direction marks, very long ids.
func TestHostileText(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	f := newFixture(t, 9, "parafac")
	f.write(t, dir)
	evil := []string{"=1+1", "+SUM(A1)", "-2", "@cmd", "\t=1", `"><script>alert(1)</script>`, "a\r\nb", "\u202eevil", strings.Repeat("long ", 2000), "{{.}}", "\x00\x01"}
	flags, err := ReadTable(filepath.Join(dir, "flags.csv"))
	must(t, err)
	for _, e := range evil {
		put(flags, "TL-0001", "b", e, "parafac", "unexplained", "doubt", 1.0, 2.0, e, e, 1)
	}
	must(t, flags.WriteFile(dir))
	s := testSettings()
	s.Pictures = false
	s.Title, s.Client, s.Remarks = evil[0], evil[5], evil[8]
	must(t, Render(context.Background(), dir, s, nil))
	for _, name := range []string{"report.xlsx", "workings.xlsx"} {
		x, err := excelize.OpenFile(filepath.Join(dir, name))
		must(t, err)
		for _, sheet := range x.GetSheetList() {
			rows, err := x.GetRows(sheet)
			must(t, err)
			for r := range rows {
				for c := range rows[r] {
					at, _ := excelize.CoordinatesToCellName(c+1, r+1)
					if formula, _ := x.GetCellFormula(sheet, at); formula != "" {
						t.Errorf("%s %s!%s holds the formula %q", name, sheet, at, formula)
					}
				}
			}
		}
		must(t, x.Close())
	}
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	must(t, err)
	for _, bad := range []string{"<script>alert", "<img src=x", "\u202e"} {
		if bytes.Contains(page, []byte(bad)) {
			t.Errorf("the page holds %q as it is", bad)
		}
	}
}

func TestRenderNamesWhatIsWrong(t *testing.T) {
	for name, spoil := range map[string]func(dir string) error{
		"samples.csv": func(d string) error { return os.Remove(filepath.Join(d, "samples.csv")) },
		"survey.nc":   func(d string) error { return os.Truncate(filepath.Join(d, StoreName), 5000) },
		"flags.csv":   func(d string) error { return os.WriteFile(filepath.Join(d, "flags.csv"), []byte("id,batch\n"), 0o600) },
	} {
		dir := t.TempDir()
		newFixture(t, 3, "parafac").write(t, dir)
		must(t, spoil(dir))
		if err := Render(context.Background(), dir, testSettings(), nil); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("%s spoilt: error %v", name, err)
		}
	}
}

// Results without a store, a model or bottles still make a report.
func TestRenderWithLittle(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9).write(t, dir) // nothing but maps
	must(t, Render(context.Background(), dir, testSettings(), nil))
	set := testSettings()
	set.Pictures = false
	must(t, os.Remove(filepath.Join(dir, StoreName)))
	must(t, os.Remove(filepath.Join(dir, "models.csv")))
	must(t, Render(context.Background(), dir, set, nil))
	empty := t.TempDir()
	must(t, NewSamples([]string{"id", "kind"}).WriteFile(empty))
	must(t, New("contributions.csv").WriteFile(empty))
	must(t, Render(context.Background(), empty, set, nil))
}

func TestRenderStops(t *testing.T) {
	dir := t.TempDir()
	newFixture(t, 9, "parafac").write(t, dir)
	ctx, stop := context.WithCancel(context.Background())
	err := Render(ctx, dir, testSettings(), func(done, total int, what string) {
		if done == 3 {
			stop()
		}
		if done > total {
			t.Errorf("%d of %d done", done, total)
		}
	})
	if err == nil {
		t.Error("a cancelled report gave no error")
	}
}

func BenchmarkRender(b *testing.B) {
	for _, n := range []int{40, 400} {
		b.Run(strconv.Itoa(n), func(b *testing.B) {
			dir := b.TempDir()
			newFixture(b, n, "parafac").write(b, dir)
			for b.Loop() {
				must(b, Render(context.Background(), dir, testSettings(), nil))
			}
			b.ReportMetric(float64(b.Elapsed().Milliseconds())/float64(b.N)/float64(n), "ms/bottle")
		})
	}
}

// BenchmarkTriptych is one bottle's picture, drawn and written.
func BenchmarkTriptych(b *testing.B) {
	dir := b.TempDir()
	newFixture(b, 9, "parafac").write(b, dir)
	s, err := OpenStore(filepath.Join(dir, StoreName))
	must(b, err)
	defer s.Close()
	tri := newTriptych(s.Grid, s.Unit, s.Methods, []string{"PARAFAC, 4 components"}, numbers{})
	for b.Loop() {
		x, err := s.Sample(3)
		must(b, err)
		var buf bytes.Buffer
		must(b, tri.draw(triptychText{id: x.ID}, []panels{newPanels(x, "parafac")}).encode(&buf))
	}
}
