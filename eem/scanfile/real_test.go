package scanfile

import (
	"math"
	"path/filepath"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

func glob(t testing.TB, pattern string) []string {
	t.Helper()
	m, err := filepath.Glob(pattern)
	if err != nil || len(m) == 0 {
		t.Fatalf("%s: no files (%v)", pattern, err)
	}
	return m
}

// readEEM reads all files as one sample.
func readEEM(t testing.TB, s *Settings, paths ...string) *eem.EEM {
	t.Helper()
	var scans []eem.Scan
	for _, p := range paths {
		f, err := Read(p, s)
		if err != nil {
			t.Fatal(err)
		}
		scans = append(scans, f.Scans...)
	}
	e, err := eem.FromScans(scans)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// sameBits reports the first difference of two EEMs.
func sameBits(t testing.TB, what string, a, b *eem.EEM) {
	t.Helper()
	if !a.Grid.Equal(b.Grid) {
		t.Fatalf("%s: grid %v, want %v", what, a.Grid, b.Grid)
	}
	for i := range a.F {
		if math.Float64bits(a.F[i]) != math.Float64bits(b.F[i]) && !(math.IsNaN(a.F[i]) && math.IsNaN(b.F[i])) {
			t.Fatalf("%s: cell %d is %v, want %v", what, i, a.F[i], b.F[i])
		}
	}
}

// The amino-acid solutions come as one grid a sample and as 61 scans a sample;
// the folder's README says that both hold the same numbers.
func TestAminoAcids(t *testing.T) {
	for _, id := range []string{"S1", "S2", "S3", "S4", "S5"} {
		grid := readEEM(t, nil, testkit.Shared(t, "data", "amino_acids", "eem", id+".csv"))
		scans := glob(t, testkit.Shared(t, "data", "amino_acids", "stacked_scans", id, "*.txt"))
		if len(scans) != 61 || grid.Ex.Len() != 61 || grid.Em.Len() != 201 || grid.Present() != 61*201 {
			t.Fatalf("%s: %d scans, %v, %d cells", id, len(scans), grid.Grid, grid.Present())
		}
		sameBits(t, id, readEEM(t, nil, scans...), grid)
		sameBits(t, id+" by name", readEEM(t, &Settings{Form: Stack, Excitation: "_ex{nm}"}, scans...), grid)
	}
}

// Cave drip water: excitations stand in the header only, missing cells are left
// out of the scans and blank in the grid. The README says 388 cells are missing
// in every sample, and that one sample is zero throughout.
func TestCaveDripwater(t *testing.T) {
	for _, p := range glob(t, testkit.Shared(t, "data", "cave_dripwater", "eem", "*.csv")) {
		e := readEEM(t, nil, p)
		if e.Ex.Len() != 73 || e.Em.Len() != 78 || e.Present() != 73*78-388 {
			t.Errorf("%s: %v with %d cells", p, e.Grid, e.Present())
		}
	}
	for _, id := range []string{"FOR_200911_m201023", "GRA_201211_m201223"} {
		grid := readEEM(t, nil, testkit.Shared(t, "data", "cave_dripwater", "eem", id+".csv"))
		scans := glob(t, testkit.Shared(t, "data", "cave_dripwater", "stacked_scans", id, "*.txt"))
		got := readEEM(t, nil, scans...)
		sameBits(t, id, got.Regrid(grid.Grid), grid)
	}
}

func TestQuinine(t *testing.T) {
	all, err := Read(testkit.Shared(t, "data", "quinine_dilution", "spectra.csv"), &Settings{Excitation: "{nm}"})
	if err == nil {
		t.Fatalf("a table of %d scans without excitation was read", len(all.Scans))
	}
	for _, p := range glob(t, testkit.Shared(t, "data", "quinine_dilution", "stacked_scans", "*.txt")) {
		e := readEEM(t, nil, p)
		if e.Ex.Len() != 1 || e.Ex.At(0) != 350 || e.Em.Len() != 181 || e.Em.First() != 405 || e.Em.Last() != 495 {
			t.Errorf("%s: %v", p, e.Grid)
		}
	}
}

// The table of the four quinine solutions, under a name that says how it was
// excited, holds the same scans as the four files.
func TestQuinineTable(t *testing.T) {
	data, err := Load(testkit.Shared(t, "data", "quinine_dilution", "spectra.csv"))
	if err != nil {
		t.Fatal(err)
	}
	f, err := ReadBytes("spectra_ex350.csv", data, nil)
	if err != nil {
		t.Fatal(err)
	}
	if n := f.Names(); len(n) != 4 || n[0] != "flu1" || n[3] != "flu6" {
		t.Fatalf("samples %q", n)
	}
	for _, id := range f.Names() {
		table, err := eem.FromScans(f.Of(id))
		if err != nil {
			t.Fatal(err)
		}
		sameBits(t, id, readEEM(t, nil, testkit.Shared(t, "data", "quinine_dilution", "stacked_scans", id+"_ex350.txt")), table)
	}
}
