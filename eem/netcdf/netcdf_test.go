package netcdf

import (
	"bytes"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

func sample() Header {
	return Header{
		Dims:  []Dim{{"time", 0}, {"x", 3}, {"name_length", 5}},
		Attrs: []Attr{{"Conventions", "CF-1.8"}, {"version", []int32{7, -8}}, {"empty", ""}},
		Vars: []Var{
			{Name: "x", Type: Double, Dims: []int{1}, Attrs: []Attr{{"units", "nm"}}},
			{Name: "scale", Type: Short},
			{Name: "name", Type: Char, Dims: []int{0, 2}},
			{Name: "value", Type: Float, Dims: []int{0, 1}, Attrs: []Attr{{"_FillValue", []float32{-1}}}},
			{Name: "why", Type: Byte, Dims: []int{0, 1}, Attrs: []Attr{{"flag_values", []int8{0, 1}}}},
			{Name: "n", Type: Int, Dims: []int{0}},
		},
	}
}

// write makes a file of the header above with the given number of records.
func write(t testing.TB, records int) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "a.nc")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	w, err := NewWriter(f, sample())
	if err != nil {
		t.Fatal(err)
	}
	must(t, w.Put("scale", []int16{-3}))
	must(t, w.Put("x", []float64{1.5, math.Pi, -2}))
	for i := range records {
		v := float32(i)
		must(t, w.Append([]byte{'a', 'b', byte('0' + i), 0, 0}, []float32{v, float32(math.NaN()), -v}, []int8{0, 1, -1}, []int32{int32(i)}))
	}
	must(t, w.Close())
	return path
}

func must(t testing.TB, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func open(t testing.TB, path string) *File {
	t.Helper()
	b, err := os.ReadFile(path)
	must(t, err)
	f, err := Read(bytes.NewReader(b), int64(len(b)))
	must(t, err)
	return f
}

func TestRoundTrip(t *testing.T) {
	f := open(t, write(t, 4))
	if !reflect.DeepEqual(f.Header, sample()) {
		t.Errorf("header came back as %+v", f.Header)
	}
	if f.Records != 4 {
		t.Fatalf("%d records, want 4", f.Records)
	}
	x, scale := make([]float64, 3), make([]int16, 1)
	must(t, f.ReadTo(x, "x", 0))
	must(t, f.ReadTo(scale, "scale", 0))
	if x[1] != math.Pi || scale[0] != -3 {
		t.Errorf("fixed variables came back as %v, %v", x, scale)
	}
	v, name, why := make([]float32, 3), make([]byte, 5), make([]int8, 3)
	for i := range 4 {
		must(t, f.ReadTo(v, "value", i))
		must(t, f.ReadTo(name, "name", i))
		must(t, f.ReadTo(why, "why", i))
		if v[0] != float32(i) || v[1] == v[1] || v[2] != -float32(i) || name[2] != byte('0'+i) || why[2] != -1 {
			t.Errorf("record %d came back as %v %q %v", i, v, name, why)
		}
	}
	for _, err := range []error{f.ReadTo(v, "value", 4), f.ReadTo(x, "value", 0), f.ReadTo(v[:2], "value", 0), f.ReadTo(v, "none", 0)} {
		if err == nil {
			t.Error("a read that cannot succeed gave no error")
		}
	}
}

// One record variable alone is written without padding (format rule): three
// bytes a record stay three.
func TestSingleRecordVariable(t *testing.T) {
	path := filepath.Join(t.TempDir(), "a.nc")
	o, err := os.Create(path)
	must(t, err)
	defer o.Close()
	w, err := NewWriter(o, Header{Dims: []Dim{{"t", 0}, {"x", 3}}, Vars: []Var{{Name: "b", Type: Byte, Dims: []int{0, 1}}}})
	must(t, err)
	for i := range int8(5) {
		must(t, w.Append([]int8{i, i + 1, i + 2}))
	}
	must(t, w.Close())
	f := open(t, path)
	b := make([]int8, 3)
	must(t, f.ReadTo(b, "b", 4))
	if f.Records != 5 || f.l.recSize != 3 || b[0] != 4 || b[2] != 6 {
		t.Errorf("%d records of %d bytes, last %v", f.Records, f.l.recSize, b)
	}
}

// The reference reader of the format's authors must see what we wrote.
func TestForeignReader(t *testing.T) {
	ncdump, err := exec.LookPath("ncdump")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("ncdump (Debian netcdf-bin) is missing")
		}
		t.Skip("ncdump (Debian netcdf-bin) is not installed")
	}
	out, err := exec.Command(ncdump, "-k", write(t, 3)).CombinedOutput()
	must(t, err)
	if got := strings.TrimSpace(string(out)); got != "64-bit offset" {
		t.Errorf("kind %q, want 64-bit offset", got)
	}
	out, err = exec.Command(ncdump, "-p", "9,17", write(t, 3)).CombinedOutput()
	must(t, err)
	for _, want := range []string{"time = UNLIMITED ; // (3 currently)", `x:units = "nm"`, "x = 1.5, 3.1415926535897931, -2 ;",
		"scale = -3 ;", `"ab0",`, "2, NaNf, -2 ;", "n = 0, 1, 2 ;", ":version = 7, -8 ;"} {
		if !strings.Contains(string(out), want) {
			t.Errorf("ncdump does not show %q in\n%s", want, out)
		}
	}
}

// A file is whole at every length or refused, never misread.
func TestCutShort(t *testing.T) {
	b, err := os.ReadFile(write(t, 2))
	must(t, err)
	for n := range len(b) {
		f, err := Read(bytes.NewReader(b[:n]), int64(n))
		if err == nil {
			t.Errorf("%d of %d bytes were taken as a file of %d records", n, len(b), f.Records)
		}
	}
	// A file that was still growing says so; the whole records in it count.
	copy(b[4:8], "\xff\xff\xff\xff")
	f, err := Read(bytes.NewReader(b[:len(b)-1]), int64(len(b)-1))
	if err != nil || f.Records != 1 {
		t.Errorf("a growing file: %v", err)
	}
}

func TestMisusePanics(t *testing.T) {
	for name, h := range map[string]Header{
		"two record dimensions": {Dims: []Dim{{"a", 0}, {"b", 0}}},
		"repeated name":         {Vars: []Var{{Name: "v", Type: Int}, {Name: "v", Type: Int}}},
		"record second":         {Dims: []Dim{{"a", 0}, {"b", 2}}, Vars: []Var{{Name: "v", Type: Int, Dims: []int{1, 0}}}},
		"unknown type":          {Vars: []Var{{Name: "v", Type: 9}}},
		"attribute type":        {Attrs: []Attr{{"a", 1}}},
	} {
		t.Run(name, func(t *testing.T) {
			defer func() {
				if recover() == nil {
					t.Error("no panic")
				}
			}()
			o, err := os.Create(filepath.Join(t.TempDir(), "a"))
			must(t, err)
			defer o.Close()
			_, _ = NewWriter(o, h)
		})
	}
}

func FuzzRead(f *testing.F) {
	for _, n := range []int{0, 2} {
		b, err := os.ReadFile(write(f, n))
		must(f, err)
		f.Add(b)
	}
	f.Add([]byte("CDF\x01\x00\x00\x00\x00"))
	f.Fuzz(func(t *testing.T, b []byte) {
		g, err := Read(bytes.NewReader(b), int64(len(b)))
		if err != nil {
			return
		}
		for i := range g.Vars {
			n, isRecord := g.Cells(i)
			if isRecord && g.Records == 0 {
				continue
			}
			if int64(n)*g.Vars[i].Type.size() > int64(len(b)) {
				t.Fatalf("variable %d of %d cells in %d bytes", i, n, len(b))
			}
			if g.Vars[i].Type == Double {
				dst := make([]float64, n)
				if err := g.ReadTo(dst, g.Vars[i].Name, max(0, g.Records-1)); err != nil && g.Var(g.Vars[i].Name) == i {
					t.Fatal(err)
				}
			}
		}
	})
}
