package eem_test

import (
	"encoding/json"
	"errors"
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"tarnlight/eem"
)

func axis(t testing.TB, nm ...float64) eem.Axis {
	t.Helper()
	a, err := eem.NewAxis(nm)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func TestNewAxisRejects(t *testing.T) {
	for _, c := range []struct {
		nm   []float64
		want string
	}{
		{nil, "at least one"},
		{[]float64{240, math.NaN()}, "positive"},
		{[]float64{-1}, "positive"},
		{[]float64{352, 352}, "wavelength 352 nm follows 352 nm"},
		{[]float64{352, 351}, "must increase"},
		{[]float64{240, math.Inf(1)}, "positive"},
	} {
		if _, err := eem.NewAxis(c.nm); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: %v, want %q", c.nm, err, c.want)
		}
	}
	if _, err := eem.Steps(240, 230, 1); err == nil {
		t.Error("descending steps accepted")
	}
	if a, err := eem.Steps(240, 250, 2.5); err != nil || a.Len() != 5 || a.Last() != 250 {
		t.Errorf("steps: %v, %v", a, err)
	}
}

// An axis copies, so that its owner cannot be surprised.
func TestAxisCopies(t *testing.T) {
	nm := []float64{1, 2}
	a := axis(t, nm...)
	nm[0] = 9
	a.Values()[1] = 9
	if a.At(0) != 1 || a.At(1) != 2 {
		t.Errorf("axis changed: %v", a.Values())
	}
}

func TestAxisJSON(t *testing.T) {
	b, err := json.Marshal(axis(t, 240, 245.5))
	if err != nil || string(b) != "[240,245.5]" {
		t.Fatalf("%s, %v", b, err)
	}
	var a eem.Axis
	if err := json.Unmarshal([]byte("[2,1]"), &a); err == nil {
		t.Error("a decreasing axis was read")
	}
}

// Linear interpolation is exact on a bilinear surface, wherever one asks.
func TestInterpBilinear(t *testing.T) {
	f := func(ex, em float64) float64 { return 2 + 0.3*ex - 0.1*em + 0.002*ex*em }
	g := eem.Grid{Ex: axis(t, 240, 250, 265), Em: axis(t, 300, 310, 312, 330)}
	cells := make([]float64, g.Cells())
	for j := range g.Ex.Len() {
		for k := range g.Em.Len() {
			cells[g.Index(j, k)] = f(g.Ex.At(j), g.Em.At(k))
		}
	}
	e := eem.FromCells(g, eem.Counts, cells)
	rapid.Check(t, func(t *rapid.T) {
		ex := rapid.Float64Range(240, 265).Draw(t, "ex")
		em := rapid.Float64Range(300, 330).Draw(t, "em")
		if got, want := e.Interp(ex, em), f(ex, em); math.Abs(got-want) > 1e-9 {
			t.Errorf("(%g, %g): %g, want %g", ex, em, got, want)
		}
	})
	if v := e.Interp(239, 310); !math.IsNaN(v) {
		t.Errorf("outside: %g", v)
	}
}

// On its own points a regridded EEM has the very numbers it had; between them a
// missing neighbour makes a missing cell, with the reason.
func TestRegrid(t *testing.T) {
	g := eem.Grid{Ex: axis(t, 240, 250), Em: axis(t, 300, 310, 320)}
	e := eem.FromCells(g, eem.Counts, []float64{1, 2, 3, 4, 5, 6})
	e.Drop(g.Index(0, 2), eem.Saturated)
	e.Var = []float64{1, 1, 1, 1, 1, 1}
	h := eem.Grid{Ex: axis(t, 240, 245, 250), Em: axis(t, 300, 305, 310, 315, 320, 330)}
	r := e.Regrid(h)
	for _, c := range []struct {
		j, k int
		v, u float64
		why  eem.Reason
	}{
		{0, 0, 1, 1, eem.Measured}, {0, 1, 1.5, 0.5, eem.Measured}, {1, 0, 2.5, 0.5, eem.Measured}, {1, 1, 3, 0.25, eem.Measured},
		{0, 3, math.NaN(), 0, eem.Saturated}, {1, 4, math.NaN(), 0, eem.Saturated}, {2, 4, 6, 1, eem.Measured}, {2, 5, math.NaN(), 0, eem.NotMeasured},
	} {
		i := h.Index(c.j, c.k)
		same := r.F[i] == c.v && r.Var[i] == c.u || math.IsNaN(c.v) && math.IsNaN(r.F[i])
		if !same || r.Why[i] != c.why {
			t.Errorf("cell (%d, %d): %g ± %g, %v; want %g, %g, %v", c.j, c.k, r.F[i], r.Var[i], r.Why[i], c.v, c.u, c.why)
		}
	}
}

func scan(t *testing.T, ex float64, file string, nm, f []float64) eem.Scan {
	return eem.Scan{Ex: ex, Em: axis(t, nm...), F: f, File: file, Line: 2}
}

func TestFromScans(t *testing.T) {
	// Unequal lengths join; the order of the files does not matter.
	e, err := eem.FromScans([]eem.Scan{
		scan(t, 260, "b.txt", []float64{300, 310, 320, 330}, []float64{5, 6, 7, 8}),
		scan(t, 250, "a.txt", []float64{300, 310}, []float64{1, math.NaN()}),
	})
	if err != nil {
		t.Fatal(err)
	}
	if e.Ex.At(0) != 250 || e.Em.Len() != 4 || e.At(0, 0) != 1 || e.At(1, 3) != 8 || e.Present() != 5 {
		t.Errorf("joined: %v, %v", e.Grid, e.F)
	}
	// The same scan twice counts once; with other numbers nobody knows.
	s := scan(t, 250, "a.txt", []float64{300, 310}, []float64{1, 2})
	if e, err := eem.FromScans([]eem.Scan{s, s}); err != nil || e.Ex.Len() != 1 {
		t.Errorf("twice the same: %v", err)
	}
	o := scan(t, 250, "b.txt", []float64{300, 310}, []float64{1, 3})
	_, err = eem.FromScans([]eem.Scan{s, o})
	var rep *eem.RepeatedExError
	if !errors.As(err, &rep) || !strings.Contains(err.Error(), "b.txt:2") || !strings.Contains(err.Error(), "a.txt:2") {
		t.Errorf("twice with other numbers: %v", err)
	}
	// Interleaved axes are brought to the longest one.
	e, err = eem.FromScans([]eem.Scan{
		scan(t, 250, "a.txt", []float64{300, 310, 320}, []float64{0, 10, 20}),
		scan(t, 260, "b.txt", []float64{301, 311, 321}, []float64{1, 11, 21}),
		scan(t, 270, "c.txt", []float64{302, 312, 322}, []float64{2, 12, 22}),
	})
	if err != nil || e.Em.Len() != 3 || e.At(1, 1) != 10 || e.At(2, 2) != 20 || !math.IsNaN(e.At(1, 0)) {
		t.Errorf("interleaved: %v %v %v", err, e.Em, e.F)
	}
}

func TestCubeSelect(t *testing.T) {
	g := eem.Grid{Ex: axis(t, 240), Em: axis(t, 300, 310)}
	c := eem.NewCube(g, []string{"a", "b"}, []*eem.EEM{eem.FromCells(g, eem.Raman, []float64{1, 2}), eem.FromCells(g, eem.Raman, []float64{3, math.NaN()})})
	s := c.Select([]int{1, 0})
	if s.IDs[0] != "b" || s.Sample(0)[0] != 3 || s.SampleWhy(0)[1] != eem.NotMeasured || s.Unit != eem.Raman {
		t.Errorf("selected %v %v", s.IDs, s.X)
	}
}

// Every code is there once, in order, and can be found; an unknown one panics
// before it can be written.
func TestTests(t *testing.T) {
	for i, x := range eem.Tests {
		if i > 0 && eem.Tests[i-1].Code >= x.Code {
			t.Errorf("%q follows %q", x.Code, eem.Tests[i-1].Code)
		}
		if got, ok := eem.FindTest(x.Code); !ok || got != x {
			t.Errorf("%q not found", x.Code)
		}
		if x.What == "" || x.Source == "" || x.Severity == eem.Information {
			t.Errorf("%q lacks words or severity", x.Code)
		}
	}
	defer func() {
		if recover() == nil {
			t.Error("a code that is not on the list made a flag")
		}
	}()
	eem.FlagFrom(eem.Note{Test: "no-such-test"}, "", "")
}

func TestAbsorbance(t *testing.T) {
	a := &eem.Absorbance{Axis: axis(t, 250, 260), A: []float64{0.4, 0.2}, PathCM: 2}
	if v := a.PerCM(255); math.Abs(v-0.15) > 1e-15 {
		t.Errorf("per cm at 255: %g, want 0.15", v)
	}
	if v := a.PerCM(261); !math.IsNaN(v) {
		t.Errorf("extrapolated: %g", v)
	}
	if v := a.Times(10).PerCM(250); v != 2 {
		t.Errorf("ten times: %g", v)
	}
}

// A scan that is missing among equally spaced ones is not made up: between 260 and
// 280 nm stands nothing, between points at the usual step a line does.
func TestRegridLeavesGaps(t *testing.T) {
	e := fill(t, []float64{240, 250, 260, 280, 290}, []float64{300, 310, 320, 340, 350})
	g := eem.Grid{Ex: axis(t, 240, 245, 260, 270, 285), Em: axis(t, 300, 305, 330, 345)}
	r := e.Regrid(g)
	for j, wantEx := range []bool{true, true, true, false, true} {
		for k, wantEm := range []bool{true, true, false, true} {
			if i := g.Index(j, k); (r.Why[i] == eem.Measured) != (wantEx && wantEm) || math.IsNaN(r.F[i]) == (wantEx && wantEm) {
				t.Errorf("ex %g, em %g: %g, %s", g.Ex.At(j), g.Em.At(k), r.F[i], r.Why[i])
			}
		}
	}
}

func fill(t *testing.T, ex, em []float64) *eem.EEM {
	t.Helper()
	g := eem.Grid{Ex: axis(t, ex...), Em: axis(t, em...)}
	f := make([]float64, g.Cells())
	for i := range f {
		f[i] = float64(i)
	}
	return eem.FromCells(g, eem.Counts, f)
}
