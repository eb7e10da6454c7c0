package report

import (
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"testing"

	"tarnlight/eem"
)

// outside returns the path of a program that a check needs. Where it is missing
// the test is skipped, but fails on the build machine (CI=true).
func outside(t testing.TB, names ...string) string {
	t.Helper()
	for _, name := range names {
		if p, err := exec.LookPath(name); err == nil {
			return p
		}
	}
	if os.Getenv("CI") == "true" {
		t.Fatalf("none of %v is installed", names)
	}
	t.Skipf("none of %v is installed", names)
	return ""
}

func must(t testing.TB, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func axis(t testing.TB, from, to, step float64) eem.Axis {
	t.Helper()
	a, err := eem.Steps(from, to, step)
	must(t, err)
	return a
}

// smallStore writes two samples of 2 × 3 cells, the second one empty.
func smallStore(t testing.TB) (string, StoreSettings) {
	path := filepath.Join(t.TempDir(), StoreName)
	s := StoreSettings{Grid: eem.Grid{Ex: axis(t, 250, 260, 10), Em: axis(t, 300, 310, 5)}, Unit: eem.Raman,
		IDs: []string{"Mühlbach 1", "B"}, Methods: []string{"parafac", "references"}, Title: "two bottles"}
	w, err := CreateStore(path, s)
	must(t, err)
	nan := math.NaN()
	must(t, w.Append("Mühlbach 1", []float64{1.0 / 3, nan, 3, 4, 5, -6}, []float32{.1, .2, .3, .4, .5, .6},
		map[string][]float64{"parafac": {1e-9, nan, 2, 3, 4, 5}}, []eem.Reason{0, eem.Raman1, 0, 0, eem.Rayleigh1, 0}))
	must(t, w.Append("B", nil, nil, nil, nil))
	must(t, w.Close())
	return path, s
}

func TestStoreRoundTrip(t *testing.T) {
	path, want := smallStore(t)
	s, err := OpenStore(path)
	must(t, err)
	defer s.Close()
	if !s.Grid.Equal(want.Grid) || s.Unit != want.Unit || !reflect.DeepEqual(s.IDs, want.IDs) || !reflect.DeepEqual(s.Methods, want.Methods) {
		t.Errorf("came back as %v %v %v %v", s.Grid, s.Unit, s.IDs, s.Methods)
	}
	a, err := s.Sample(0)
	must(t, err)
	if a.ID != "Mühlbach 1" || a.Corrected[0] != 1.0/3 || !math.IsNaN(a.Corrected[1]) || a.Corrected[5] != -6 ||
		a.U[5] != .6 || a.Residual["parafac"][0] != 1e-9 || a.Residual["references"][0] == a.Residual["references"][0] || a.Why[4] != eem.Rayleigh1 {
		t.Errorf("sample came back as %+v", a)
	}
	b, err := s.Sample(1)
	must(t, err)
	if !math.IsNaN(b.Corrected[0]) || b.Why[0] != eem.NotMeasured {
		t.Errorf("the empty bottle came back as %+v", b)
	}
}

func TestStoreRefusesOtherFiles(t *testing.T) {
	dir := t.TempDir()
	for name, content := range map[string]string{"empty.nc": "", "text.nc": "id,value\n", "short.nc": "CDF\x02\x00\x00"} {
		path := filepath.Join(dir, name)
		must(t, os.WriteFile(path, []byte(content), 0o600))
		if _, err := OpenStore(path); err == nil {
			t.Errorf("%s was opened", name)
		}
	}
}

// SciPy reads the same shape, numbers, missing cells and words as we wrote.
func TestStoreInSciPy(t *testing.T) {
	python := outside(t, "/usr/bin/python3", "python3")
	path, _ := smallStore(t)
	const script = `
import sys, json
try:
    import numpy as np
    from scipy.io import netcdf_file
except ImportError:
    sys.exit(9)
f = netcdf_file(sys.argv[1], mmap=False)
v = f.variables
c = v['corrected']
print(json.dumps({
  'shape': list(c.shape), 'dims': list(c.dimensions), 'units': c.units.decode(),
  'corner': float(c[0,1,2]), 'third': float(c[0,0,0]), 'missing': bool(np.isnan(c[0,0,1])),
  'empty': bool(np.isnan(c[1]).all()), 'ids': [bytes(r).rstrip(b'\0').decode() for r in v['sample_id'][:]],
  'why': v['why_missing'][0].ravel().tolist(), 'words': v['why_missing'].flag_meanings.decode().split(),
  'em': v['emission'][:].tolist(), 'nm': v['emission'].units.decode(), 'residual': float(v['residual_parafac'][0,1,2]),
  'conventions': f.Conventions.decode()}))`
	out, err := exec.Command(python, "-c", script, path).Output()
	if e, ok := err.(*exec.ExitError); ok && e.ExitCode() == 9 && os.Getenv("CI") != "true" {
		t.Skip("SciPy is not installed")
	}
	must(t, err)
	var got struct {
		Shape                   []int
		Dims, IDs, Words        []string
		Units, Nm, Conventions  string
		Corner, Third, Residual float64
		Missing, Empty          bool
		Why                     []int
		Em                      []float64
	}
	must(t, json.Unmarshal(out, &got))
	if !reflect.DeepEqual(got.Shape, []int{2, 2, 3}) || !reflect.DeepEqual(got.Dims, []string{"sample", "excitation", "emission"}) ||
		got.Units != "RU" || got.Nm != "nm" || got.Conventions != "CF-1.8" || got.Corner != -6 || got.Third != 1.0/3 ||
		got.Residual != 5 || !got.Missing || !got.Empty || !reflect.DeepEqual(got.IDs, []string{"Mühlbach 1", "B"}) ||
		!reflect.DeepEqual(got.Why, []int{0, 9, 0, 0, 7, 0}) || len(got.Words) != int(eem.NumReasons) || got.Words[9] != "Raman_first_order" ||
		!reflect.DeepEqual(got.Em, []float64{300, 305, 310}) {
		t.Errorf("SciPy sees %s", out)
	}
}

// Whatever the bytes, opening and reading neither panics nor takes much memory.
func FuzzOpenStore(f *testing.F) {
	path, _ := smallStore(f)
	b, err := os.ReadFile(path)
	must(f, err)
	f.Add(b)
	f.Fuzz(func(t *testing.T, b []byte) {
		path := filepath.Join(t.TempDir(), "x.nc")
		must(t, os.WriteFile(path, b, 0o600))
		s, err := OpenStore(path)
		if err != nil {
			return
		}
		defer s.Close()
		for i := range s.IDs[:min(3, len(s.IDs))] {
			if x, err := s.Sample(i); err == nil && len(x.Corrected) > len(b) {
				t.Fatalf("%d cells from %d bytes", len(x.Corrected), len(b))
			}
		}
	})
}
