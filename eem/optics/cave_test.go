package optics_test

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/testkit"
)

// cave is the folder of 33 natural drip waters with eight published indices
// each: Endres et al. 2023, Quaternary Research, doi:10.1017/qua.2023.41.
func cave(t *testing.T) string {
	t.Helper()
	return testkit.Shared(t, "data", "cave_dripwater")
}

// names pairs the columns of published_indices.csv with ours, as the README
// beside the data defines them.
var names = map[string]string{
	"fi": "fi_450_500", "bix": "bix", "hix": "hix_sum", "b": "peak_b", "t": "peak_t", "a": "peak_a", "m": "peak_m", "c": "peak_c",
}

const zeroSample = "GLO_200807_m210714" // entirely zero, as published

// TestDripWaterArray: every index of every sample from the array on its exact
// axes, to 1e-8 (they agree to 1e-11).
func TestDripWaterArray(t *testing.T) {
	dir := cave(t)
	x, shape := testkit.Npy(t, filepath.Join(dir, "X.npy"))
	ex, em := readAxis(t, filepath.Join(dir, "ex_nm.csv")), readAxis(t, filepath.Join(dir, "em_nm.csv"))
	g := eem.Grid{Ex: ex, Em: em}
	for _, row := range readTable(t, filepath.Join(dir, "published_indices.csv")) {
		i, _ := strconv.Atoi(row["row"])
		f := make([]float64, g.Cells())
		for j := range shape[2] {
			for k := range shape[1] {
				f[g.Index(j, k)] = x[(i*shape[1]+k)*shape[2]+j] // sample × em × ex there
			}
		}
		compare(t, row, eem.FromCells(g, eem.Raman, f), 1e-8, 1e-8)
	}
}

// TestDripWaterGrids: the same from the grid files, whose emission axis is
// rounded to 1e-4 nm, to 1e-5.
func TestDripWaterGrids(t *testing.T) {
	dir := cave(t)
	for _, row := range readTable(t, filepath.Join(dir, "published_indices.csv")) {
		e := readGridFile(t, filepath.Join(dir, "eem", row["sample"]+".csv"))
		compare(t, row, e, 1e-5, 5e-4)
	}
}

// TestDripWaterScans: two samples given as stacked scans have the indices of
// their grid files.
func TestDripWaterScans(t *testing.T) {
	dir := cave(t)
	folders, err := os.ReadDir(filepath.Join(dir, "stacked_scans"))
	if err != nil || len(folders) != 2 {
		t.Fatalf("%d folders, %v", len(folders), err)
	}
	for _, d := range folders {
		want := optics.Flat(optics.Fluorescence(readGridFile(t, filepath.Join(dir, "eem", d.Name()+".csv"))))
		got := optics.Flat(optics.Fluorescence(readScans(t, filepath.Join(dir, "stacked_scans", d.Name()))))
		if len(got) != len(want) || len(want) < len(names) {
			t.Errorf("%s: %d indices from scans, %d from the grid", d.Name(), len(got), len(want))
		}
		for n, w := range want {
			if math.Abs(got[n]-w) > 1e-6*math.Abs(w) { // scans are rounded to 8 digits, the grid to 1e-4 nm
				t.Errorf("%s: %s %.12g from scans, %.12g from the grid", d.Name(), n, got[n], w)
			}
		}
	}
}

func compare(t *testing.T, row map[string]string, e *eem.EEM, tol, tolB float64) {
	t.Helper()
	got := optics.Flat(optics.Fluorescence(e))
	if row["sample"] == zeroSample {
		for _, n := range []string{"fi", "bix", "hix"} {
			if v, ok := got[names[n]]; ok {
				t.Errorf("%s: %s is %g; a ratio of nothing must be refused", zeroSample, n, v)
			}
		}
		return
	}
	for col, name := range names {
		want, err := strconv.ParseFloat(row[col], 64)
		if err != nil {
			t.Fatalf("%s %s: %v", row["sample"], col, err)
		}
		limit := tol
		if col == "b" {
			limit = tolB // interpolated between rows that nearly cancel
		}
		// One published b is −4e−16, the rounding error of a zero.
		if v, ok := got[name]; !ok || !(math.Abs(v-want) <= limit*math.Abs(want)+1e-15) {
			t.Errorf("%s: %s %.12g, published %.12g", row["sample"], name, v, want)
		}
	}
}

func readTable(t *testing.T, path string) []map[string]string {
	rec := testkit.Records(t, path)
	var out []map[string]string
	for _, r := range rec[1:] {
		m := map[string]string{}
		for i, v := range r {
			m[rec[0][i]] = v
		}
		out = append(out, m)
	}
	return out
}

// number parses a cell, NaN for a blank one.
func number(t *testing.T, s string) float64 {
	t.Helper()
	if s == "" {
		return math.NaN()
	}
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func axis(t *testing.T, nm []float64) eem.Axis {
	t.Helper()
	a, err := eem.NewAxis(nm)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// readAxis reads one number a line. The emission axis is 240 + 360·k/77 nm,
// written with 10 digits; the exact one is restored.
func readAxis(t *testing.T, path string) eem.Axis {
	var nm []float64
	for _, r := range testkit.Records(t, path) {
		nm = append(nm, number(t, r[0]))
	}
	if len(nm) == 78 {
		for k := range nm {
			exact := 240 + 360*float64(k)/77
			if math.Abs(nm[k]-exact) > 1e-6 {
				t.Fatalf("emission %g nm at %d, want %g", nm[k], k, exact)
			}
			nm[k] = exact
		}
	}
	return axis(t, nm)
}

// readGridFile reads emission × excitation with excitations in the first row.
func readGridFile(t *testing.T, path string) *eem.EEM {
	rec := testkit.Records(t, path)
	var ex, em []float64
	for _, s := range rec[0][1:] {
		ex = append(ex, number(t, s))
	}
	for _, r := range rec[1:] {
		em = append(em, number(t, r[0]))
	}
	g := eem.Grid{Ex: axis(t, ex), Em: axis(t, em)}
	f := make([]float64, g.Cells())
	for k, r := range rec[1:] {
		for j, s := range r[1:] {
			f[g.Index(j, k)] = number(t, s)
		}
	}
	return eem.FromCells(g, eem.Raman, f)
}

// readScans reads a folder of two-column scans with "Excitation <nm> nm" in the header.
func readScans(t *testing.T, dir string) *eem.EEM {
	files, err := filepath.Glob(filepath.Join(dir, "*.txt"))
	if err != nil {
		t.Fatal(err)
	}
	var scans []eem.Scan
	for _, path := range files {
		b, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		s := eem.Scan{File: path}
		var em []float64
		for line := range strings.Lines(string(b)) {
			var x, y float64
			if n, _ := fmt.Sscanf(line, "%g\t%g", &x, &y); n == 2 {
				em, s.F = append(em, x), append(s.F, y)
			} else {
				_, _ = fmt.Sscanf(line, "Excitation\t%g nm", &s.Ex)
			}
		}
		s.Em = axis(t, em)
		scans = append(scans, s)
	}
	e, err := eem.FromScans(scans)
	if err != nil {
		t.Fatal(err)
	}
	return e
}
