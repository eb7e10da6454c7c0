package main

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/scanfile"
)

// curve writes a table of f from lo to hi nm.
func curve(t testing.TB, name string, lo, hi, step float64, u float64, f func(nm float64) float64) {
	t.Helper()
	var b strings.Builder
	b.WriteString("wavelength_nm,value")
	if u > 0 {
		b.WriteString(",standard_uncertainty")
	}
	b.WriteString("\n")
	for nm := lo; nm <= hi+1e-9; nm += step {
		fmt.Fprintf(&b, "%g,%.12g", nm, f(nm))
		if u > 0 {
			fmt.Fprintf(&b, ",%.12g", u*f(nm))
		}
		b.WriteString("\n")
	}
	if err := os.WriteFile(name, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
}

func bell(at, width float64) func(float64) float64 {
	return func(nm float64) float64 { z := (nm - at) / width; return math.Exp(-z * z / 2) }
}

// Two invented materials on a detector whose response is known give back its
// inverse, joined, with the uncertainty of both scans and certificates; in energy
// units it differs from photons by the wavelength: at 400 nm 0.888889 and at 600 nm
// 1.333333 of 450 nm (CHK-2a, computed).
func TestFactorsVerb(t *testing.T) {
	dir := t.TempDir()
	t.Chdir(dir)
	response := func(nm float64) float64 { return 1 - 0.003*(nm-450) + 4e-6*(nm-450)*(nm-450) }
	blue, red := bell(430, 45), bell(560, 50)
	seen := func(f func(float64) float64, k float64) func(float64) float64 {
		return func(nm float64) float64 { return k*f(nm)*response(nm) + 7 }
	}
	curve(t, "blue.csv", 350, 520, 5, 0.02, blue)
	curve(t, "red.csv", 480, 650, 5, 0.03, red)
	curve(t, "bluescan.csv", 340, 600, 1, 0.005, seen(blue, 5000))
	curve(t, "redscan.csv", 400, 700, 1, 0.005, seen(red, 900))
	curve(t, "water.csv", 340, 700, 10, 0, func(float64) float64 { return 7 })
	args := []string{"factors", "emission", "--certificate", "blue.csv", "--scan", "bluescan.csv", "--certificate", "red.csv", "--scan", "redscan.csv",
		"--blank", "water.csv", "--reference", "450"}
	r := call(append(args, "--certified", "photons", "-o", "photons.csv")...).want(t, exitDone)
	if !strings.Contains(r.err, "never extrapolated") || !strings.Contains(r.err, "photons") {
		t.Errorf("told: %s", r.err)
	}
	f, _, err := scanfile.ReadFactors("photons.csv", nil)
	if err != nil {
		t.Fatal(err)
	}
	if f.Axis.First() < 350 || f.Axis.Last() > 650 {
		t.Errorf("extrapolated: %s", f.Axis)
	}
	for i, c := range f.Factor {
		nm := f.Axis.At(i)
		if want := response(450) / response(nm); math.Abs(c/want-1) > 1e-4 { // the scan is interpolated by 1 nm
			t.Errorf("%g nm: factor %g, want %g", nm, c, want)
		}
		// One certificate alone √(2² + 0.5²) % with the blank's 7 counts, two joined less.
		if rel := f.U[i] / c; rel < 0.014 || rel > 0.033 {
			t.Errorf("%g nm: relative uncertainty %g", nm, rel)
		}
	}
	call(append(args, "--certified", "energy", "-o", "energy.csv")...).want(t, exitDone)
	e, _, err := scanfile.ReadFactors("energy.csv", nil)
	if err != nil {
		t.Fatal(err)
	}
	for nm, want := range map[float64]float64{400: 0.888889, 600: 1.333333} {
		i, ok1 := e.Axis.Find(nm)
		k, ok2 := f.Axis.Find(nm)
		if !ok1 || !ok2 || math.Abs(e.Factor[i]/f.Factor[k]-want) > 2e-6 {
			t.Errorf("%g nm: energy over photons %g, want %g", nm, e.Factor[i]/f.Factor[k], want)
		}
	}
	// A file in use is not overwritten, and what cannot be joined is told.
	call(append(args, "--certified", "energy", "-o", "energy.csv")...).want(t, exitFailed)
	call(args...).want(t, exitMisuse)
	curve(t, "far.csv", 700, 800, 5, 0, bell(750, 40))
	if r := call(append(args, "--certified", "photons", "--certificate", "far.csv", "--scan", "far.csv")...); r.code != exitFailed {
		t.Errorf("sections without overlap: exit %d, %s", r.code, r.err)
	}
}

// A quantum counter's signal gives the lamp's inverse; factors in energy units
// differ by the wavelength.
func TestFactorsExcitation(t *testing.T) {
	t.Chdir(t.TempDir())
	lamp := func(nm float64) float64 { return 2 + math.Sin(nm/50) }
	curve(t, "counter.csv", 250, 450, 5, 0.01, lamp)
	for _, units := range []string{"photons", "energy"} {
		call("factors", "excitation", "--certified", "photons", "--units", units, "--scan", "counter.csv", "--reference", "350", "-o", units+".csv").want(t, exitDone)
		f, _, err := scanfile.ReadFactors(filepath.Join(".", units+".csv"), nil)
		if err != nil {
			t.Fatal(err)
		}
		for i, c := range f.Factor {
			nm := f.Axis.At(i)
			want := lamp(350) / lamp(nm)
			if units == "energy" { // light of energy N·hc/λ: its inverse grows with λ
				want *= nm / 350
			}
			if math.Abs(c/want-1) > 1e-6 || math.Abs(f.U[i]/c-0.01) > 1e-4 {
				t.Errorf("%s, %g nm: %g ± %g, want %g", units, nm, c, f.U[i], want)
			}
		}
	}
}

// A scan is read as the instrument exports it, and gives the same factors as the
// plain table of its numbers; what is wrong with a file is told with its line.
func TestFactorsReadExports(t *testing.T) {
	t.Chdir(t.TempDir())
	lamp := func(nm float64) float64 { return 2 + math.Sin(nm/50) }
	curve(t, "table.csv", 250, 450, 5, 0, lamp)
	rows := strings.Split(strings.TrimSpace(read(t, "table.csv")), "\n")[1:]
	slices.Reverse(rows)
	text := strings.NewReplacer(",", "\t", ".", ",").Replace(strings.Join(rows, "\r\n"))
	put(t, ".", "export.txt", "Fluorometer F-1\r\nSlit\t2,5 nm\r\n\r\nWavelength (nm)\tIntensity (a.u.)\r\n"+text+"\r\nEnd of scan\r\n")
	factors := func(scan string) string {
		return call("factors", "excitation", "--certified", "photons", "--scan", scan, "--reference", "350").want(t, exitDone).out
	}
	_, want, _ := strings.Cut(factors("table.csv"), "\n")
	if _, got, _ := strings.Cut(factors("export.txt"), "\n"); got != want || strings.Count(got, "\n") < 40 {
		t.Errorf("factors of the export:\n%s\nof the table:\n%s", got, want)
	}
	for text, want := range map[string]string{"nm,value\n400,1\n410,x\n420,2\n": "curve.csv:3", "hello\n": "curve.csv: holds no rows", "nm,value\n400,1\n": "only 1 wavelength",
		"nm,value,u\n400,1,0.1\n410,1\n": "curve.csv:3"} {
		put(t, ".", "curve.csv", text)
		if r := call("factors", "excitation", "--certified", "photons", "--scan", "curve.csv").want(t, exitFailed); !strings.Contains(r.err, want) {
			t.Errorf("%q: %s, want %q", text, r.err, want)
		}
	}
}
