package main

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// rSquared is the squared correlation of x and y.
func rSquared(x, y []float64) float64 {
	n := float64(len(x))
	var mx, my, sxx, syy, sxy float64
	for i := range x {
		mx, my = mx+x[i]/n, my+y[i]/n
	}
	for i := range x {
		sxx += (x[i] - mx) * (x[i] - mx)
		syy += (y[i] - my) * (y[i] - my)
		sxy += (x[i] - mx) * (y[i] - my)
	}
	return sxy * sxy / sxx / syy
}

const aminoSettings = `
[sheet]
root = %q
[correct]
inner_filter = "none"
blank = "none"
[intensity]
unit = "counts"
[scatter]
rayleigh.first = { below = 10, above = 10 }
rayleigh.second = "off"
raman.first = "off"
raman.second = "off"
[report]
pictures = "none"
`

func aminoKnown(t *testing.T, data string) map[string][]float64 {
	known := map[string][]float64{}
	for _, line := range strings.Split(strings.TrimSpace(read(t, data, "concentrations.csv")), "\n")[1:] {
		f := strings.Split(strings.TrimSpace(line), ",")
		for _, s := range f[1:] {
			known[f[0]] = append(known[f[0]], number(t, s))
		}
	}
	return known
}

// Three components without references: what the paper of the data says is there.
func TestAminoResolve(t *testing.T) {
	data := testkit.Shared(t, "data", "amino_acids")
	known := aminoKnown(t, data)
	dir := folder(t, map[string]string{
		"runsheet.csv": "id,kind,scans\nS1,sample,S1\nS2,sample,S2\nS3,sample,S3\nS4,sample,S4\nS5,sample,S5\n",
		"survey.toml":  fmt.Sprintf(aminoSettings, filepath.Join(data, "stacked_scans")) + "[resolve]\ncomponents = 3\n",
	})
	call("resolve", dir).want(t, exitDone, exitDoubt)
	explained := number(t, cell(t, table(t, dir, "out", "models.csv"), "explained_percent", "components", "3"))
	if explained < 99.9 {
		t.Errorf("explains %.4f %%, want 99.9", explained)
	}
	c := table(t, dir, "out", "contributions.csv")
	fmax := map[string][]float64{}
	for _, id := range []string{"S1", "S2", "S3", "S4", "S5"} {
		for f := range 3 {
			name := fmt.Sprintf("C%d", f+1)
			fmax[name] = append(fmax[name], number(t, cell(t, c, "value", "id", id, "component", name)))
		}
	}
	for s, want := range []float64{0.999, 0.999, 0.99} {
		name := []string{"tryptophan", "tyrosine", "phenylalanine"}[s]
		var given []float64
		for _, id := range []string{"S1", "S2", "S3", "S4", "S5"} {
			given = append(given, known[id][s])
		}
		best := 0.0
		for _, v := range fmax {
			best = max(best, rSquared(v, given))
		}
		t.Logf("%s: R² %.6f (explained %.4f %%)", name, best, explained)
		if best < want {
			t.Errorf("%s: R² %.5f, want %g", name, best, want)
		}
	}
}

// The pure solutions as standards give the two mixtures.
func TestAminoQuantify(t *testing.T) {
	data := testkit.Shared(t, "data", "amino_acids")
	known := aminoKnown(t, data)
	sheet := "id,kind,scans,conc:tryptophan [mol/L],conc:tyrosine [mol/L],conc:phenylalanine [mol/L]\n"
	for i, id := range []string{"S1", "S2", "S3", "S4", "S5"} {
		conc := []string{"", "", ""}
		kind := "sample"
		if i < 3 {
			kind, conc[i] = "standard", fmt.Sprint(known[id][i])
		}
		sheet += fmt.Sprintf("%s,%s,%s,%s\n", id, kind, id, strings.Join(conc, ","))
	}
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(aminoSettings, filepath.Join(data, "stacked_scans"))})
	call("quantify", dir).want(t, exitDone, exitDoubt)
	c := table(t, dir, "out", "contributions.csv")
	for s, name := range []string{"tryptophan", "tyrosine", "phenylalanine"} {
		for _, id := range []string{"S4", "S5"} {
			got, want := number(t, cell(t, c, "value", "id", id, "component", name)), known[id][s]
			off := 100 * (got/want - 1)
			t.Logf("%s in %s: %.4g, known %.4g (%+.2f %%)", name, id, got, want, off)
			if limit := []float64{5, 5, 15}[s]; math.Abs(off) > limit {
				t.Errorf("%s in %s is off by %.1f %%, limit %g %%", name, id, off, limit)
			}
		}
	}
}

// Natural water, corrected by its authors: read whole; the sample of zeros is not
// usable, which is not the same as "not detected".
func TestCaveDripwater(t *testing.T) {
	testkit.Heavy(t)
	data := testkit.Shared(t, "data", "cave_dripwater")
	files, err := filepath.Glob(filepath.Join(data, "eem", "*.csv"))
	if err != nil || len(files) != 33 {
		t.Fatalf("%d files, %v", len(files), err)
	}
	sheet := "id,kind,scans,site\n"
	for _, f := range files {
		name := filepath.Base(f)
		sheet += fmt.Sprintf("%s,sample,%s,%s\n", strings.TrimSuffix(name, ".csv"), name, name[:3])
	}
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(`
[sheet]
root = %q
[scans]
applied = ["offset", "spectral", "inner-filter", "blank", "intensity", "dilution", "scatter"]
[intensity]
unit = "raman"
[resolve]
components = 5
scale_samples = false # the figure below is of a fit to the intensities as they are
[report]
pictures = "none"
`, filepath.Join(data, "eem"))})
	call("run", dir).want(t, exitDoubt)
	explained := number(t, cell(t, table(t, dir, "out", "models.csv"), "explained_percent", "components", "5"))
	t.Logf("5 components explain %.3f %%", explained)
	if explained < 94 {
		t.Errorf("explains %.3f %%, want 94", explained)
	}
	c := table(t, dir, "out", "contributions.csv")
	zero, rows := 0, 0
	for _, row := range c.Rows {
		if row[c.Col("method")] == "unexplained" { // what the components leave over
			continue
		}
		rows++
		if row[c.Col("unit")] != "RU" {
			t.Fatalf("unit %q", row[c.Col("unit")])
		}
		if row[c.Col("id")] == "GLO_200807_m210714" {
			zero++
			if q := row[c.Col("qualifier")]; q != "R" {
				t.Errorf("zero sample, %s: qualifier %q, want R", row[c.Col("component")], q)
			}
		} else if row[c.Col("qualifier")] == "R" {
			t.Errorf("%s is R: %s", row[c.Col("id")], row[c.Col("reasons")])
		}
	}
	if rows != 33*5 {
		t.Errorf("%d rows, want 33 × 5", rows)
	}
	if zero != 5 {
		t.Errorf("%d rows of the zero sample", zero)
	}
	// Nothing here is sure, and the batch is not called good.
	if b := table(t, dir, "out", "batches.csv"); b.Text(0, b.Col("verdict")) != "doubt" || !strings.Contains(b.Text(0, b.Col("reason")), "not one of the 33 samples") {
		t.Errorf("the batch is called %q, %q", b.Text(0, b.Col("verdict")), b.Text(0, b.Col("reason")))
	}
	if s := table(t, dir, "out", "steps.csv"); cell(t, s, "unit", "step", "noise", "parameter", "read noise") != "RU" {
		t.Error("readings in RU have a noise in another unit")
	}
	// Of these two both diagonals glow: the flag speaks of scatter, not of a substance.
	for _, id := range []string{"GRA_201016_m201023", "GRA_201211_m201223"} {
		f := table(t, dir, "out", "flags.csv")
		if m := cell(t, f, "message", "id", id, "method", "parafac", "test", "unexplained"); !strings.Contains(m, "scatter is left in this bottle") || !strings.Contains(m, "along the Rayleigh line") || !strings.Contains(m, "[scans] applied") {
			t.Errorf("%s: %q", id, m)
		}
	}
}

// Each quinine solution from the other three lies within its 95 % interval: the
// solutions scatter by 5 % about their line where noise explains 0.3 %. The series
// has an intercept, which is told in calibration.csv.
func TestQuinineDilution(t *testing.T) {
	data := testkit.Shared(t, "data", "quinine_dilution")
	conc := map[string]float64{"flu1": 0.05, "flu2": 0.10, "flu4": 0.20, "flu6": 0.30}
	ids := []string{"flu1", "flu2", "flu4", "flu6"}
	for _, out := range ids {
		sheet := "id,kind,scans,conc:quinine [mg/L]\n"
		for _, id := range ids {
			kind, c := "standard", fmt.Sprint(conc[id])
			if id == out {
				kind, c = "sample", ""
			}
			sheet += fmt.Sprintf("%s,%s,%s_ex350.txt,%s\n", id, kind, id, c)
		}
		dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf(`
[sheet]
root = %q
[correct]
inner_filter = "none"
blank = "none"
[intensity]
unit = "counts"
[report]
pictures = "none"
`, filepath.Join(data, "stacked_scans"))})
		call("run", dir).want(t, exitDone, exitDoubt)
		c := table(t, dir, "out", "contributions.csv")
		got, lower, upper := number(t, cell(t, c, "value", "id", out)), number(t, cell(t, c, "lower95", "id", out)), number(t, cell(t, c, "upper95", "id", out))
		off := 100 * (got/conc[out] - 1)
		cal := table(t, dir, "out", "calibration.csv")
		intercept := cell(t, cal, "line_intercept", "kind", "standard")
		se := cell(t, cal, "line_intercept_standard_error", "kind", "standard")
		t.Logf("%s: %.5f mg/L (%.5f–%.5f), known %.2f (%+.2f %%); intercept %s ± %s mg/L", out, got, lower, upper, conc[out], off, intercept, se)
		if conc[out] < lower || conc[out] > upper {
			t.Errorf("%s: %g mg/L is not within %g–%g", out, conc[out], lower, upper)
		}
		if math.Abs(off) > 7 {
			t.Errorf("%s is off by %.1f %%", out, off)
		}
		if number(t, intercept) == 0 || number(t, se) <= 0 {
			t.Errorf("%s left out: intercept %q ± %q", out, intercept, se)
		}
	}
}

// The same survey in three forms and with both decimal marks gives the same bytes.
func TestFormsAgree(t *testing.T) {
	testkit.Heavy(t)
	data := testkit.Shared(t, "data", "amino_acids")
	known := aminoKnown(t, data)
	ids := []string{"S1", "S2", "S3", "S4", "S5"}
	var first map[string]string
	for _, form := range []string{"stack", "grid", "long"} {
		for _, decimal := range []string{".", ","} {
			dir := folder(t, nil)
			sheet := "id,kind,scans,conc:tryptophan [mol/L]\n"
			for i, id := range ids {
				kind, c := "sample", ""
				if i == 0 {
					kind, c = "standard", fmt.Sprint(known[id][0])
				}
				sheet += fmt.Sprintf("%s,%s,raw/%s,%s\n", id, kind, id, c)
				copyAs(t, filepath.Join(data, "stacked_scans", id), dir, id, form, decimal)
			}
			put(t, dir, "runsheet.csv", sheet)
			put(t, dir, "survey.toml", strings.Replace(fmt.Sprintf(aminoSettings, ""), "root = \"\"", "", 1)+"[resolve]\ncomponents = 3\nstarts = 2\n")
			call("run", dir).want(t, exitDone, exitDoubt)
			got := map[string]string{}
			for _, name := range []string{"contributions.csv", "samples.csv", "components.csv"} {
				got[name] = read(t, dir, "out", name)
			}
			if first == nil {
				first = got
			}
			for name := range got {
				if got[name] != first[name] {
					t.Errorf("%s differs in form %s, decimal %q", name, form, decimal)
				}
			}
		}
	}
}

// copyAs writes the stacked scans of a bottle in another form.
func copyAs(t *testing.T, from, dir, id, form, decimal string) {
	t.Helper()
	files, err := os.ReadDir(from)
	if err != nil {
		t.Fatal(err)
	}
	sep := map[string]string{".": ",", ",": ";"}[decimal]
	mark := func(s string) string { return strings.Replace(s, ".", decimal, 1) }
	var exs, ems []string
	cells := map[[2]string]string{}
	for _, f := range files {
		text := read(t, from, f.Name())
		ex := strings.TrimSuffix(f.Name()[strings.Index(f.Name(), "ex")+2:], ".txt")
		exs = append(exs, ex)
		for _, line := range strings.Split(text, "\n") {
			v := strings.Fields(line)
			if len(v) != 2 || strings.HasPrefix(line, "#") {
				continue
			}
			if len(exs) == 1 {
				ems = append(ems, v[0])
			}
			cells[[2]string{ex, v[0]}] = v[1]
		}
	}
	var b strings.Builder
	switch form {
	case "stack":
		for _, ex := range exs {
			b.Reset()
			fmt.Fprintf(&b, "emission_nm%sintensity\n", sep)
			for _, em := range ems {
				fmt.Fprintf(&b, "%s%s%s\n", mark(em), sep, mark(cells[[2]string{ex, em}]))
			}
			put(t, dir, fmt.Sprintf("raw/%s/%s_ex%s.csv", id, id, ex), b.String())
		}
		return
	case "grid":
		b.WriteString("em_nm\\ex_nm")
		for _, ex := range exs {
			b.WriteString(sep + ex)
		}
		b.WriteString("\n")
		for _, em := range ems {
			b.WriteString(mark(em))
			for _, ex := range exs {
				b.WriteString(sep + mark(cells[[2]string{ex, em}]))
			}
			b.WriteString("\n")
		}
	case "long":
		fmt.Fprintf(&b, "excitation_nm%semission_nm%sintensity\n", sep, sep)
		for _, ex := range exs {
			for _, em := range ems {
				fmt.Fprintf(&b, "%s%s%s%s%s\n", mark(ex), sep, mark(em), sep, mark(cells[[2]string{ex, em}]))
			}
		}
	}
	put(t, dir, fmt.Sprintf("raw/%s/%s.csv", id, id), b.String())
}
