package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// The best 3 of 61 excitations for the amino acids: both mixtures quantified with
// them and with all 61, against the known concentrations.
func TestPlanAmino(t *testing.T) {
	testkit.Heavy(t)
	data := testkit.Shared(t, "data", "amino_acids")
	known := aminoKnown(t, data)
	names := []string{"tryptophan", "tyrosine", "phenylalanine"}
	ids := []string{"S1", "S2", "S3", "S4", "S5"}
	sheet := "id,kind,scans,conc:tryptophan [mol/L],conc:tyrosine [mol/L],conc:phenylalanine [mol/L]\n"
	for i, id := range ids {
		conc, kind := []string{"", "", ""}, "sample"
		if i < 3 {
			kind, conc[i] = "standard", fmt.Sprint(known[id][i])
		}
		sheet += fmt.Sprintf("%s,%s,%s,%s\n", id, kind, id, strings.Join(conc, ","))
	}
	all := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(aminoSettings, filepath.Join(data, "stacked_scans"))})
	r := planJSON(t, []int{exitDone}, all, "--scans", "3")
	best := r.Plans[2]
	t.Logf("noise: %s; 1 to 3 scans: %v, %v, %v nm (%s)", r.Noise, r.Plans[0].Excitations, r.Plans[1].Excitations, best.Excitations, best.Searched)
	few := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(aminoSettings, ".")})
	for _, id := range ids {
		for _, ex := range best.Excitations {
			file := fmt.Sprintf("%s/%s_ex%g.txt", id, id, ex)
			put(t, few, file, read(t, data, "stacked_scans", file))
		}
	}
	call("quantify", all).want(t, exitDone, exitDoubt)
	call("quantify", few).want(t, exitDone, exitDoubt)
	a, b := table(t, all, "out", "contributions.csv"), table(t, few, "out", "contributions.csv")
	for f, name := range names {
		for _, id := range []string{"S4", "S5"} {
			full, three, want := number(t, cell(t, a, "value", "id", id, "component", name)), number(t, cell(t, b, "value", "id", id, "component", name)), known[id][f]
			u, uFull := number(t, cell(t, b, "standard_uncertainty", "id", id, "component", name)), number(t, cell(t, a, "standard_uncertainty", "id", id, "component", name))
			t.Logf("%-13s in %s: known %.4g; 61 scans %.4g (%+.2f %%, u %.2g %%, predicted %.2g %%); 3 scans %.4g (%+.2f %%, u %.2g %%, predicted %.2g %%)", name, id, want,
				full, 100*(full/want-1), 100*uFull/want, *r.Full.Components[f].Percent, three, 100*(three/want-1), 100*u/want, *best.Components[f].Percent)
			// Not further from the truth than what TestAminoQuantify allows all 61.
			if limit := []float64{5, 5, 15}[f]; math.Abs(100*(three/want-1)) > limit {
				t.Errorf("%s in %s with three scans is off by %.1f %%, limit %g %%", name, id, 100*(three/want-1), limit)
			}
		}
	}
}

// Plans for the five components of the drip water: contributions from 3, 5 and 8 of 73
// excitations against those from all of them.
func TestPlanCave(t *testing.T) {
	testkit.Heavy(t)
	data := testkit.Shared(t, "data", "cave_dripwater")
	files, err := filepath.Glob(filepath.Join(data, "eem", "*.csv"))
	if err != nil || len(files) == 0 {
		t.Fatal(files, err)
	}
	sheet := "id,kind,scans\n"
	for _, f := range files {
		sheet += fmt.Sprintf("%s,sample,%s\n", strings.TrimSuffix(filepath.Base(f), ".csv"), filepath.Base(f))
	}
	settings := func(root, more string) string {
		return fmt.Sprintf("[sheet]\nroot = %q\n[scans]\napplied = [\"offset\", \"spectral\", \"inner-filter\", \"blank\", \"intensity\", \"dilution\", \"scatter\"]\n[intensity]\nunit = \"raman\"\n[report]\npictures = \"none\"\n%s", root, more)
	}
	first := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": settings(filepath.Join(data, "eem"), "[resolve]\ncomponents = 5\nstarts = 2\n")})
	call("run", first).want(t, exitDoubt)
	model := filepath.Join(first, "out", "model.json")
	// The files come corrected, so that the noise of no count is known.
	r := planJSON(t, []int{exitDone}, model, "--like", first, "--scans", "8")
	quantified := func(lines []float64) map[string][]float64 {
		dir := folder(t, map[string]string{"runsheet.csv": sheet, "model.json": read(t, model), "survey.toml": settings(".", "[quantify]\nreferences = { file = \"model.json\" }\n[resolve]\ncomponents = \"off\"\n")})
		for _, f := range files {
			put(t, dir, filepath.Base(f), read(t, f))
			if lines != nil {
				keepLines(t, filepath.Join(dir, filepath.Base(f)), lines)
			}
		}
		call("run", dir).want(t, exitDone, exitDoubt)
		c := table(t, dir, "out", "contributions.csv")
		out := map[string][]float64{}
		for _, row := range c.Rows {
			if row[c.Col("method")] == "references" && row[c.Col("qualifier")] != "R" {
				out[row[c.Col("component")]] = append(out[row[c.Col("component")]], number(t, row[c.Col("value")]))
			}
		}
		return out
	}
	full := quantified(nil)
	for _, n := range []int{3, 5, 8} {
		p := r.Plans[n-1]
		got := quantified(p.Excitations)
		var text []string
		for _, c := range p.Components {
			r2 := rSquared(full[c.Name], got[c.Name])
			text = append(text, fmt.Sprintf("%s %.4f", c.Name, math.Sqrt(r2)))
			if len(got[c.Name]) != len(full[c.Name]) || !(math.Sqrt(r2) > 0.8) { // three scans for five components that emit alike
				t.Errorf("%d scans, %s: %d and %d bottles, correlation %.4f", n, c.Name, len(got[c.Name]), len(full[c.Name]), math.Sqrt(r2))
			}
		}
		t.Logf("%d of 73 scans, %v nm: correlation with all scans %s (%d bottles)", n, p.Excitations, strings.Join(text, ", "), len(got[p.Components[0].Name]))
	}
	// apply on such bottles uses the scans that were made, and no numbers between them.
	lines := slices.Clone(r.Plans[7].Excitations)
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": settings(".", "")})
	for _, f := range files {
		put(t, dir, filepath.Base(f), read(t, f))
		keepLines(t, filepath.Join(dir, filepath.Base(f)), lines)
	}
	call("apply", model, dir).want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "contributions.csv")
	got := map[string][]float64{}
	for _, row := range c.Rows {
		if row[c.Col("method")] == "model" && row[c.Col("qualifier")] != "R" {
			got[row[c.Col("component")]] = append(got[row[c.Col("component")]], number(t, row[c.Col("value")]))
		}
	}
	for name, v := range got {
		r2 := rSquared(full[name], v)
		t.Logf("apply on 8 scans, %s: correlation %.4f", name, math.Sqrt(r2))
		if !(math.Sqrt(r2) > 0.9) {
			t.Errorf("apply on 8 scans, %s: correlation %.4f", name, math.Sqrt(r2))
		}
	}
}

// One substance at one excitation has one plan: that scan.
func TestPlanQuinine(t *testing.T) {
	data := testkit.Shared(t, "data", "quinine_dilution")
	sheet := "id,kind,scans,conc:quinine [mg/L]\n"
	for id, c := range map[string]string{"flu1": "0.05", "flu2": "0.10", "flu4": "0.20", "flu6": "0.30"} {
		sheet += fmt.Sprintf("%s,standard,%s_ex350.txt,%s\n", id, id, c)
	}
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(aminoSettings, filepath.Join(data, "stacked_scans"))})
	res := call("plan", dir).want(t, exitDone)
	t.Log("\n" + res.out + res.err)
	for _, want := range []string{"1 scan at ex 350 nm", "a quarter of the highest standard"} {
		if !strings.Contains(res.out+res.err, want) {
			t.Errorf("lacks %q", want)
		}
	}
}
