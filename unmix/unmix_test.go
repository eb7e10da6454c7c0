package unmix_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
)

func grid(t testing.TB) eem.Grid {
	t.Helper()
	ex, err := eem.Steps(250, 350, 10)
	if err != nil {
		t.Fatal(err)
	}
	em, err := eem.Steps(300, 500, 5)
	if err != nil {
		t.Fatal(err)
	}
	return eem.Grid{Ex: ex, Em: em}
}

// bump is a smooth spectrum on an axis, maximum 1.
func bump(a eem.Axis, at, width float64) []float64 {
	v := make([]float64, a.Len())
	for i := range v {
		d := (a.At(i) - at) / width
		v[i] = math.Exp(-d * d / 2)
	}
	return v
}

// known is a set of two overlapping components per mg/L.
func known(t testing.TB) *unmix.Set {
	g := grid(t)
	return &unmix.Set{Grid: g, Unit: eem.Raman, Method: "references", Origin: "test", Components: []unmix.Component{
		{Name: "one", AmountUnit: "mg/L", Scale: 2, Ex: bump(g.Ex, 280, 20), Em: bump(g.Em, 340, 25)},
		{Name: "two", AmountUnit: "mg/L", Scale: 0.5, Ex: bump(g.Ex, 310, 30), Em: bump(g.Em, 400, 40)},
	}}
}

// bottle mixes the components of s with noise.
func bottle(s *unmix.Set, amounts []float64, noise float64, rnd *rand.Rand) *eem.EEM {
	f := make([]float64, s.Grid.Cells())
	for j := range s.Grid.Ex.Len() {
		for k := range s.Grid.Em.Len() {
			for c := range s.Components {
				f[s.Grid.Index(j, k)] += amounts[c] * s.Components[c].At(s.Grid, j, k)
			}
			if noise > 0 {
				f[s.Grid.Index(j, k)] += noise * rnd.NormFloat64()
			}
		}
	}
	return eem.FromCells(s.Grid, s.Unit, f)
}

func TestFromStandardsRecoversSlopes(t *testing.T) {
	s := known(t)
	clipped := bottle(s, []float64{8, 0}, 0, nil)
	top := s.Grid.Index(3, 8)
	clipped.Drop(top, eem.Saturated)
	mixed := bottle(s, []float64{1, 2}, 0, nil)
	refs, lines, err := unmix.FromStandards(s.Grid, s.Unit, []string{"one", "two"}, []string{"mg/L", "mg/L"}, []unmix.Standard{
		{ID: "a", EEM: bottle(s, []float64{2, 0}, 0, nil), Conc: map[string]float64{"one": 2}},
		{ID: "b", EEM: clipped, Conc: map[string]float64{"one": 8}},
		{ID: "c", EEM: bottle(s, []float64{0, 3}, 0, nil), Conc: map[string]float64{"two": 3}},
		{ID: "d", EEM: mixed, Conc: map[string]float64{"one": 1, "two": 2}},
	})
	if err != nil {
		t.Fatal(err)
	}
	for c := range s.Components {
		for j := range s.Grid.Ex.Len() {
			for k := range s.Grid.Em.Len() {
				want, got := s.Components[c].At(s.Grid, j, k), refs.Components[c].At(s.Grid, j, k)
				if math.Abs(got-want) > 1e-12 {
					t.Fatalf("component %d cell (%d, %d): %g, want %g", c, j, k, got, want)
				}
			}
		}
		// The surface is rank one, so its loadings are the known ones.
		for k, v := range refs.Components[c].Em {
			if math.Abs(v-s.Components[c].Em[k]) > 1e-9 {
				t.Errorf("component %d emission %d: %g, want %g", c, k, v, s.Components[c].Em[k])
			}
		}
		if l := lines[c]; math.Abs(l.Slope-1) > 1e-9 || math.Abs(l.Intercept) > 1e-9 {
			t.Errorf("line of exact data: %s", l)
		}
	}
	if refs.Components[0].Highest != 8 || refs.Components[0].Levels != 3 {
		t.Errorf("highest %g of %d levels", refs.Components[0].Highest, refs.Components[0].Levels)
	}
}

// Two components that only occur in one ratio cannot be told apart.
func TestFromStandardsFixedRatio(t *testing.T) {
	s := known(t)
	_, _, err := unmix.FromStandards(s.Grid, s.Unit, []string{"one", "two"}, []string{"", ""}, []unmix.Standard{
		{ID: "a", EEM: bottle(s, []float64{1, 1}, 0, nil), Conc: map[string]float64{"one": 1, "two": 1}},
		{ID: "b", EEM: bottle(s, []float64{2, 2}, 0, nil), Conc: map[string]float64{"one": 2, "two": 2}},
	})
	if err == nil || !strings.Contains(err.Error(), `"one"`) {
		t.Errorf("fixed ratio: %v", err)
	}
	_, _, err = unmix.FromStandards(s.Grid, s.Unit, []string{"one", "two"}, []string{"", ""}, []unmix.Standard{
		{ID: "a", EEM: bottle(s, []float64{1, 0}, 0, nil), Conc: map[string]float64{"one": 1, "two": 0}},
	})
	if err == nil || !strings.Contains(err.Error(), `"two"`) {
		t.Errorf("no level above 0: %v", err)
	}
}

// The intercept and its standard error are those of NIST StRD Norris (certified:
// B0 = −0.262323073774029, sd 0.232818234301152, B1 = 1.00211681802045).
func TestLineNorris(t *testing.T) {
	x := []float64{.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777, 558.2, .4, .6, 775.5, 666.9, 338, 447.5, 11.6, 556, 228.1, 995.8, 887.6, 120.2, .3, .3, 556.8, 339.1, 887.2, 999, 779, 11.1, 118.3, 229.2, 669.1, 448.9, .5}
	y := []float64{.1, 338.8, 118.1, 888, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, .3, .1, 778.1, 668.8, 339.3, 448.9, 10.8, 557.7, 228.3, 998, 888.8, 119.6, .3, .6, 557.6, 339.3, 888, 998.5, 778.9, 10.2, 117.6, 228.9, 668.4, 449.2, .2}
	var l unmix.Line
	for i := range x {
		l.Points = append(l.Points, unmix.Point{Given: x[i], Found: y[i]})
	}
	l = unmix.FitLine(l.Component, l.Points)
	for _, c := range []struct {
		name      string
		got, want float64
	}{{"B0", l.Intercept, -0.262323073774029}, {"sd(B0)", l.InterceptSE, 0.232818234301152}, {"B1", l.Slope, 1.00211681802045}} {
		if lre := -math.Log10(math.Abs(c.got-c.want) / math.Abs(c.want)); lre < 12 {
			t.Errorf("%s = %.15g, certified %.15g: %.1f digits", c.name, c.got, c.want, lre)
		}
	}
	if _, _, doubtful := l.Doubtful(0); doubtful {
		t.Error("an intercept of 1.1 standard errors is called doubtful")
	}
}

// A bottle's answer does not depend on the bottles beside it, and missing cells
// change nothing but the cells used.
func TestQuantify(t *testing.T) {
	s := known(t)
	rnd := rand.New(rand.NewPCG(1, 2))
	var es []*eem.EEM
	var ids []string
	for i := range 300 {
		e := bottle(s, []float64{rnd.Float64() * 5, rnd.Float64() * 5}, 0.01, rnd)
		if i%7 == 0 {
			e.Drop(i%s.Grid.Cells(), eem.Saturated)
		}
		es, ids = append(es, e), append(ids, fmt.Sprint(i))
	}
	all, err := unmix.Quantify(eem.NewCube(s.Grid, ids, es), s)
	if err != nil {
		t.Fatal(err)
	}
	for _, i := range []int{0, 6, 7, 255, 256, 299} {
		one, err := unmix.Quantify(eem.NewCube(s.Grid, ids[i:i+1], es[i:i+1]), s)
		if err != nil {
			t.Fatal(err)
		}
		for f := range 2 {
			if a, b := all.Value[2*i+f], one.Value[f]; a != b {
				t.Errorf("bottle %d component %d: %.17g among 300, %.17g alone", i, f, a, b)
			}
		}
		if all.Fits[i] != one.Fits[0] {
			t.Errorf("bottle %d: %+v among 300, %+v alone", i, all.Fits[i], one.Fits[0])
		}
		if v := all.Fits[i].Violation; v > 1e-10 {
			t.Errorf("bottle %d: certificate %g", i, v)
		}
	}
	if n := all.Fits[0].Cells; n != s.Grid.Cells()-1 {
		t.Errorf("%d cells used", n)
	}
}

func TestQuantifyFewCells(t *testing.T) {
	s := known(t)
	e := eem.New(s.Grid, s.Unit)
	e.F[0], e.Why[0] = 1, eem.Measured
	r, err := unmix.Quantify(eem.NewCube(s.Grid, []string{"x"}, []*eem.EEM{e}), s)
	if err != nil {
		t.Fatal(err)
	}
	if r.Fits[0].Usable || !math.IsNaN(r.Value[0]) || !strings.Contains(r.Fits[0].Reason, "1 measured cells for 2") {
		t.Errorf("%+v, %v", r.Fits[0], r.Value)
	}
	o := *s
	o.Unit = eem.Quinine
	if _, err := unmix.Quantify(eem.NewCube(s.Grid, []string{"x"}, []*eem.EEM{e}), &o); err == nil || !strings.Contains(err.Error(), "QSU") {
		t.Errorf("unit: %v", err)
	}
}

func TestModelFile(t *testing.T) {
	s := known(t)
	s.Components[0].Ex[0] = math.NaN()
	m := unmix.NewModel(s, "a model")
	b := marshal(t, m)
	back, err := unmix.ParseModel("model.json", b)
	if err != nil {
		t.Fatal(err)
	}
	r := back.Set()
	if !math.IsNaN(r.Components[0].Ex[0]) || r.Components[1].Em[7] != s.Components[1].Em[7] || r.Components[1].AmountUnit != "mg/L" {
		t.Errorf("read back: %+v", r.Components)
	}
	for bad, want := range map[string]string{
		"{":                                "model.json:1",
		"{}":                               "version or components",
		`{"version":99,"components":[{}]}`: "version 99",
		`{"version":1,"components":[{"name":"a"}],"grid":{"excitation_nm":[2,1],"emission_nm":[1]}}`: "must increase",
		`{"version":1,"components":[{"name":"a"}],"grid":{"excitation_nm":[2],"emission_nm":[3]}}`:   "length of the grid",
	} {
		if _, err := unmix.ParseModel("model.json", []byte(bad)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, want %q", bad, err, want)
		}
	}
}

func TestParseComponents(t *testing.T) {
	head := []string{"component", "mode", "wavelength_nm", "loading", "unit"}
	rows := [][]string{
		{"a", "excitation", "250", "0.5", "mg/L"}, {"a", "excitation", "260", "1", "mg/L"},
		{"a", "emission", "310", "2", "mg/L"}, {"a", "emission", "300", "1", "mg/L"}, {"a", "scale", "", "3", "mg/L"},
	}
	line := []int{2, 3, 4, 5, 6}
	s, err := unmix.ParseComponents("refs.csv", head, rows, line)
	if err != nil {
		t.Fatal(err)
	}
	c := s.Components[0]
	if c.Scale != 6 || c.Em[0] != 0.5 || c.Em[1] != 1 || s.Grid.Em.At(0) != 300 {
		t.Errorf("%+v", c)
	}
	for _, b := range []struct {
		change func([][]string)
		want   string
	}{
		{func(r [][]string) { r[1][3] = "x" }, `refs.csv:3: "x" is not a number`},
		{func(r [][]string) { r[1][1] = "ex" }, `refs.csv:3: mode "ex"`},
		{func(r [][]string) { r[1][2] = "" }, "refs.csv:3: the wavelength is missing"},
		{func(r [][]string) { r[1][3] = "-1" }, "refs.csv:3: loading -1"},
		{func(r [][]string) { r[1][2] = "250" }, "refs.csv:3: component \"a\" gives excitation 250 nm twice (before in line 2)"},
		{func(r [][]string) { r[0][0] = "" }, "refs.csv:2: the component has no name"},
		{func(r [][]string) { r[4][3] = "0" }, "refs.csv:6: the scale"},
	} {
		bad := make([][]string, len(rows))
		for i := range rows {
			bad[i] = append([]string(nil), rows[i]...)
		}
		b.change(bad)
		if _, err := unmix.ParseComponents("refs.csv", head, bad, line); err == nil || !strings.Contains(err.Error(), b.want) {
			t.Errorf("got %v, want %q", err, b.want)
		}
	}
	if _, err := unmix.ParseComponents("refs.csv", head[1:], rows, line); err == nil || !strings.Contains(err.Error(), `no column "component"`) {
		t.Errorf("no column: %v", err)
	}
}
