package report

import (
	"archive/zip"
	"bytes"
	"encoding/csv"
	"io"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// Charts, pictures and coloured cells survive the stream writer, which loses what
// is added after its rows (they are counted in the written file).
func TestWorkingsAreComplete(t *testing.T) {
	testkit.Heavy(t)
	dir := rendered(t, 30, func(s *RenderSettings) { s.Pictures = false }, "references", "parafac")
	z, err := zip.OpenReader(filepath.Join(dir, "workings.xlsx"))
	must(t, err)
	defer z.Close()
	count := map[string]int{}
	for _, f := range z.File {
		r, err := f.Open()
		must(t, err)
		part, err := io.ReadAll(r)
		must(t, err)
		if strings.HasPrefix(f.Name, "xl/charts/") {
			count["series"] += bytes.Count(part, []byte("<ser>")) + bytes.Count(part, []byte("<c:ser>"))
		}
		if strings.HasPrefix(f.Name, "xl/drawings/drawing") {
			count["placed chart"] += bytes.Count(part, []byte("<xdr:graphicFrame"))
			count["placed picture"] += bytes.Count(part, []byte("<xdr:pic>"))
		}
		if strings.HasPrefix(f.Name, "xl/worksheets/sheet") {
			count["map"] += bytes.Count(part, []byte("<colorScale>"))
			count["drawing"] += bytes.Count(part, []byte("<drawing "))
		}
	}
	// two quality variables; two methods with excitation and emission spectra
	for kind, want := range map[string]int{"placed chart": 2 + 2*2, "placed picture": 8, "map": worstMaps, "drawing": 4, "series": 2*6 + 2*2*4} {
		if count[kind] != want {
			t.Errorf("%d × %s, want %d (%v)", count[kind], kind, want, count)
		}
	}
}

// LibreOffice, a program that knows nothing of the library, reads the same numbers.
func TestWorkbookInLibreOffice(t *testing.T) {
	if testing.Short() {
		t.Skip("takes seconds")
	}
	office, err := exec.LookPath("soffice")
	if err != nil {
		t.Skip("LibreOffice is not installed")
	}
	dir := rendered(t, 12, func(s *RenderSettings) { s.Pictures = false }, "parafac")
	for _, name := range []string{"report.xlsx", "workings.xlsx"} {
		// every sheet as CSV in UTF-8, numbers with all digits
		cmd := exec.Command(office, "-env:UserInstallation=file://"+t.TempDir(), "--headless", "--convert-to", "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,-1",
			"--outdir", dir, filepath.Join(dir, name))
		if out, err := cmd.CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
	}
	shown, err := os.ReadFile(filepath.Join(dir, "report-Results.csv"))
	must(t, err)
	r := csv.NewReader(bytes.NewReader(shown))
	r.FieldsPerRecord = -1
	rows, err := r.ReadAll()
	must(t, err)
	got := map[string][]string{}
	for _, row := range rows {
		got[row[0]] = row
	}
	c, err := ReadTable(filepath.Join(dir, "contributions.csv"))
	must(t, err)
	first := slices.Index(rows[2], "1 Tryptophan-like, RU")
	if first < 0 {
		first = slices.Index(rows[3], "1 Tryptophan-like, RU")
	}
	for i := range c.Rows {
		id, k := visible(c.Text(i, 0)), slices.Index(fixtureNames, c.Text(i, 1))
		if got[id] == nil {
			t.Fatalf("no row of %q", id)
		}
		text, want := got[id][first+3*k], c.Float(i, c.Col("value"))
		switch c.Text(i, c.Col("qualifier")) {
		case "R":
			if text != c.Text(i, c.Col("reported")) {
				t.Errorf("%s: %q", id, text)
			}
			continue
		case "U":
			want = c.Float(i, c.Col("detection_limit"))
		}
		if v, err := strconv.ParseFloat(text, 64); err != nil || math.Abs(v-want) > 1e-14*want {
			t.Errorf("%s %s: LibreOffice reads %q, written was %g", id, c.Text(i, 1), text, want)
		}
	}
	for _, sheet := range []string{"Components", "Budget", "Thumbnails", "Provenance"} {
		if info, err := os.Stat(filepath.Join(dir, "workings-"+sheet+".csv")); err != nil || info.Size() < 50 {
			t.Errorf("LibreOffice sees nothing on the sheet %s of workings.xlsx: %v", sheet, err)
		}
	}
}
