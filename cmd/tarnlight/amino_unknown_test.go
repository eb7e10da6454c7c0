package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"testing"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/testkit"
)

// Real measurements: tryptophan and tyrosine are given as references, phenylalanine,
// which two of three samples hold, is not. What the references leave over peaks
// where phenylalanine's own solution S3 does, to 5 nm.
func TestAminoMissing(t *testing.T) {
	testkit.Heavy(t)
	data := testkit.Shared(t, "data", "amino_acids")
	known := aminoKnown(t, data)
	sheet := fmt.Sprintf("id,kind,scans,conc:tryptophan [mol/L],conc:tyrosine [mol/L]\nS1,standard,S1,%g,\nS2,standard,S2,,%g\nS3,sample,S3,,\nS4,sample,S4,,\nS5,sample,S5,,\n",
		known["S1"][0], known["S2"][1])
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(aminoSettings, filepath.Join(data, "stacked_scans"))})
	call("quantify", dir).want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "components.csv")
	method, name, mode, nm, load := c.Col("method"), c.Col("component"), c.Col("mode"), c.Col("wavelength_nm"), c.Col("loading")
	peak := map[string]float64{}
	top := map[string]float64{}
	first := ""
	for _, r := range c.Rows {
		if r[method] != "unexplained" || (first != "" && r[name] != first) {
			continue
		}
		first = r[name]
		if v := number(t, r[load]); v > top[r[mode]] {
			top[r[mode]], peak[r[mode]] = v, number(t, r[nm])
		}
	}
	if first == "" {
		t.Fatal("no unknown component was found")
	}
	ex, em := s3Peak(t, filepath.Join(data, "stacked_scans", "S3"))
	t.Logf("%s: peak ex %g / em %g nm; S3 itself %g / %g nm", first, peak["excitation"], peak["emission"], ex, em)
	if math.Abs(peak["excitation"]-ex) > 5 || math.Abs(peak["emission"]-em) > 5 {
		t.Errorf("unknown at ex %g / em %g nm, S3 peaks at %g / %g nm", peak["excitation"], peak["emission"], ex, em)
	}
	f := table(t, dir, "out", "flags.csv")
	var ids []string
	for _, r := range f.Rows {
		if r[f.Col("test")] == "unknown" && r[f.Col("component")] == first {
			ids = append(ids, r[f.Col("id")])
		}
	}
	if !slices.Contains(ids, "S3") {
		t.Errorf("shown by %v, want S3 among them", ids)
	}
}

// s3Peak is where the scans themselves are highest, away from the scatter lines.
func s3Peak(t *testing.T, dir string) (ex, em float64) {
	files, err := filepath.Glob(filepath.Join(dir, "*"))
	if err != nil || len(files) == 0 {
		t.Fatalf("%d files, %v", len(files), err)
	}
	best := 0.0
	for _, name := range files {
		f, err := scanfile.Read(name, nil)
		if err != nil {
			t.Fatal(err)
		}
		for _, s := range f.Scans {
			for k, v := range s.F {
				if nm := s.Em.At(k); math.Abs(nm-s.Ex) > 12 && v > best {
					best, ex, em = v, s.Ex, nm
				}
			}
		}
	}
	return ex, em
}
