package correct_test

import (
	"math"
	"slices"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/testkit"
)

// testCodes lists the codes of the findings in e's notes.
func testCodes(e *eem.EEM) string {
	var s []string
	for _, n := range e.Notes {
		if n.Test != "" {
			s = append(s, n.Test)
		}
	}
	return strings.Join(s, " ")
}

func finding(t *testing.T, e *eem.EEM, code string) eem.Note {
	t.Helper()
	for _, n := range e.Notes {
		if n.Test == code {
			return n
		}
	}
	t.Fatalf("no %s among %q", code, testCodes(e))
	return eem.Note{}
}

// TestInnerFilterRange: beside the absorbance spectrum cells become missing, and
// what was missing before keeps its reason.
func TestInnerFilterRange(t *testing.T) {
	g := grid(t, []float64{250, 300}, []float64{310, 400, 500})
	e := eem.FromCells(g, eem.Counts, []float64{1, 2, math.NaN(), 4, 5, 6})
	e.Var = []float64{1, 1, math.NaN(), 1, 1, 1}
	ax, _ := eem.NewAxis([]float64{260, 450})
	a := &eem.Absorbance{Axis: ax, A: []float64{0.2, 0.01}, PathCM: 1}
	out, factor := correct.InnerFilter(e, a, correct.Geometry{}, 0)
	want := []eem.Reason{eem.NoAbsorbance, eem.NoAbsorbance, eem.NotMeasured, eem.Measured, eem.Measured, eem.NoAbsorbance}
	if !slices.Equal(out.Why, want) {
		t.Errorf("reasons %v, want %v", out.Why, want)
	}
	k := math.Pow(10, (a.PerCM(300)+a.PerCM(400))/2)
	near(t, "cell", out.F[4], 5*k, 1e-14)
	near(t, "variance", out.Var[4], k*k, 1e-14)
	near(t, "factor", factor[4], k, 1e-14)
	if !math.IsNaN(factor[0]) || !math.IsNaN(factor[2]) {
		t.Errorf("factors outside the spectrum: %v", factor)
	}
	if n := finding(t, out, "absorbance-range"); n.Value != 3 || n.Severity != eem.Doubt {
		t.Errorf("%+v", n)
	}
}

// TestInnerFilterLimit: over the limit the value is kept and the dilution named
// that would bring the bottle back; such a dilution indeed does.
func TestInnerFilterLimit(t *testing.T) {
	g := grid(t, []float64{250, 300}, []float64{310, 400})
	e := eem.FromCells(g, eem.Counts, []float64{1, 1, 1, 1})
	ax, _ := eem.NewAxis([]float64{200, 600})
	a := &eem.Absorbance{Axis: ax, A: []float64{4, 0}, PathCM: 2} // 2 per cm at 200 nm
	out, _ := correct.InnerFilter(e, a, correct.Geometry{}, 1.5)
	n := finding(t, out, "absorbance-limit")
	near(t, "total", n.Value, 1.75+1.45, 1e-12)
	if !strings.Contains(n.Msg, "ex 250 / em 310 nm") || !strings.Contains(n.Msg, "at least 2.2-fold") {
		t.Errorf("%s", n.Msg)
	}
	if out.Present() != 4 {
		t.Errorf("%d cells left; over-absorbing cells keep their value", out.Present())
	}
	if got := correct.OverShare(e, a, correct.Geometry{}, 2.6); got != 0.75 { // 3.2, 2.75, 2.95 and 2.5
		t.Errorf("share of cells above 2.6: %g", got)
	}
	again, _ := correct.InnerFilter(e, a.Times(1/2.2), correct.Geometry{}, 1.5)
	if c := testCodes(again); c != "" {
		t.Errorf("after the dilution it asked for: %q", c)
	}
	dropped := correct.DropOverAbsorbing(e, a, correct.Geometry{}, 2.6)
	if w := []eem.Reason{eem.OverAbsorbing, eem.OverAbsorbing, eem.OverAbsorbing, eem.Measured}; !slices.Equal(dropped.Why, w) {
		t.Errorf("reasons %v", dropped.Why)
	}
}

// TestNoAbsorbance: nothing is multiplied, and it is told.
func TestNoAbsorbance(t *testing.T) {
	g := grid(t, []float64{250}, []float64{310, 400})
	out, factor := correct.InnerFilter(eem.FromCells(g, eem.Counts, []float64{1, 2}), nil, correct.Geometry{}, 0)
	if out.F[0] != 1 || out.F[1] != 2 || !math.IsNaN(factor[0]) || testCodes(out) != "no-absorbance" {
		t.Errorf("%v %v %q", out.F, factor, testCodes(out))
	}
}

// TestPAH: three hydrocarbons at three concentrations, 1 cm, centre form, ex 290
// and em 400. Molar absorption coefficients, L mol⁻¹ cm⁻¹, of Karcher et al.
// 1985, Spectral Atlas of Polycyclic Aromatic Compounds, and Friedel & Orchin
// 1952; the absorbances (coefficient × concentration) and the factors below were
// worked out from them with 10^((A290+A400)/2) apart from this program.
func TestPAH(t *testing.T) {
	table := pahTable(t)
	for _, c := range []struct {
		name    string
		microM  float64
		ax, am  float64 // ε·c at 290 and 400 nm
		factor  float64
		linearX float64 // ln(10)·A at 290 nm
	}{
		{"Fluoranthene", 1, 0.016344, 1e-05, 1.019007, 0.0376334},
		{"Fluoranthene", 10, 0.16344, 0.0001, 1.207174, 0.376334},
		{"Fluoranthene", 40, 0.65376, 0.0004, 2.123636, 1.50534},
		{"Benzo[a]pyrene", 1, 0.030625, 0.000819, 1.036864, 0.0705167},
		{"Benzo[a]pyrene", 10, 0.30625, 0.00819, 1.436217, 0.705167},
		{"Benzo[a]pyrene", 40, 1.225, 0.03276, 4.254808, 2.82067},
		{"Perylene", 1, 0.001566, 0.017075, 1.021693, 0.00360585},
		{"Perylene", 10, 0.01566, 0.17075, 1.239381, 0.0360585},
		{"Perylene", 40, 0.06264, 0.683, 2.359500, 0.144234},
	} {
		ax, eps := table[c.name].axis, table[c.name].eps
		a := &eem.Absorbance{Axis: ax, A: make([]float64, len(eps)), PathCM: 1}
		for i, v := range eps {
			a.A[i] = v * c.microM * 1e-6
		}
		near(t, c.name+" A290", a.PerCM(290), c.ax, 1e-9)
		near(t, c.name+" A400", a.PerCM(400), c.am, 1e-9)
		g := grid(t, []float64{290}, []float64{400})
		_, factor := correct.InnerFilter(eem.FromCells(g, eem.Counts, []float64{1}), a, correct.Geometry{}, 0)
		near(t, c.name+" factor", factor[0], c.factor, 1e-5)
		near(t, c.name+" x", correct.Linear(g.Ex, a, 1)[0].X, c.linearX, 1e-5)
	}
}

type spectrum struct {
	axis eem.Axis
	eps  []float64
}

// pahTable reads the spectra by name.
func pahTable(t *testing.T) map[string]spectrum {
	t.Helper()
	rec := testkit.Records(t, testkit.Shared(t, "data", "pah_molar_absorption", "pah_molar_absorption.csv"))
	out := map[string]spectrum{}
	for col, name := range rec[0][1:] {
		var nm, eps []float64
		for _, r := range rec[1:] {
			if v, err := strconv.ParseFloat(r[col+1], 64); err == nil {
				w, _ := strconv.ParseFloat(r[0], 64)
				nm, eps = append(nm, w), append(eps, v)
			}
		}
		ax, err := eem.NewAxis(nm)
		if err != nil {
			t.Fatal(err)
		}
		out[name] = spectrum{ax, eps}
	}
	return out
}
