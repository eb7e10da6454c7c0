package optics_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/optics"
)

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s: %.15g, want %.15g", what, got, want)
	}
}

func steps(t *testing.T, from, to, step float64) eem.Axis {
	t.Helper()
	a, err := eem.Steps(from, to, step)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// fill makes an EEM from a function of ex and em.
func fill(ex, em eem.Axis, f func(ex, em float64) float64) *eem.EEM {
	g := eem.Grid{Ex: ex, Em: em}
	v := make([]float64, g.Cells())
	for j := range ex.Len() {
		for k := range em.Len() {
			v[g.Index(j, k)] = f(ex.At(j), em.At(k))
		}
	}
	return eem.FromCells(g, eem.Raman, v)
}

func byName(t *testing.T, list []optics.Index, name string) optics.Index {
	t.Helper()
	for _, ix := range list {
		if ix.Name == name {
			return ix
		}
	}
	t.Fatalf("no index %s", name)
	return optics.Index{}
}

// TestSUVA: CHK-7a, Weishaar et al. 2003 (definition); numbers computed.
func TestSUVA(t *testing.T) {
	a := &eem.Absorbance{Axis: steps(t, 250, 260, 1), A: make([]float64, 11), PathCM: 1}
	for i := range a.A {
		a.A[i] = 0.150
	}
	list := optics.Absorption(a, 4.00)
	near(t, "A254, m⁻¹", optics.Decadic(a, 254), 15.0, 1e-12)
	near(t, "SUVA254", byName(t, list, "suva254").Value, 3.75, 1e-12)
	near(t, "a254, m⁻¹", byName(t, list, "a254").Value, 34.53877639491069, 1e-12)
	a.PathCM = 5
	near(t, "SUVA254, 5 cm", byName(t, optics.Absorption(a, 4), "suva254").Value, 0.75, 1e-12)
	if r := byName(t, optics.Absorption(a, math.NaN()), "suva254").Refused; !strings.Contains(r, "doc_mg_per_l") {
		t.Errorf("without DOC: %q", r)
	}
}

// TestAromaticity: CHK-7b, Weishaar et al. 2003 (coefficients from memory).
func TestAromaticity(t *testing.T) {
	near(t, "SUVA 3.2", optics.Aromaticity(3.2), 24.494, 1e-12)
	near(t, "SUVA 5.3", optics.Aromaticity(5.3), 38.186, 1e-12)
}

// twoSlopes is the spectrum of CHK-7c.
func twoSlopes(t *testing.T) *eem.Absorbance {
	a := &eem.Absorbance{Axis: steps(t, 270, 410, 1), A: make([]float64, 141), PathCM: 1}
	for i := range a.A {
		nm := a.Axis.At(i)
		v := 10 * math.Exp(-0.015*(min(nm, 320)-275)-0.018*max(0, nm-320)) // m⁻¹
		a.A[i] = v / (100 * math.Ln10)
	}
	return a
}

// TestSlopes: CHK-7c (computed): both fits give the slopes of a noise-free
// spectrum. Definition: Helms et al. 2008.
func TestSlopes(t *testing.T) {
	a := twoSlopes(t)
	list := optics.Absorption(a, 0)
	near(t, "S275–295", byName(t, list, "s_275_295").Value, 0.0150, 1e-9)
	near(t, "S350–400", byName(t, list, "s_350_400").Value, 0.0180, 1e-9)
	near(t, "S_R", byName(t, list, "s_r").Value, 0.8333333333333331, 1e-9)
	for _, c := range []struct{ from, to, want float64 }{{275, 295, 0.015}, {350, 400, 0.018}} {
		s, err := optics.SlopeDirect(a, c.from, c.to)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "direct fit", s, c.want, 1e-9)
	}
}

// TestSlopeDirectIsLeastSquares: with noise the direct fit's residual is
// orthogonal to both derivatives of the model, which makes it the least-squares
// answer.
func TestSlopeDirectIsLeastSquares(t *testing.T) {
	a := twoSlopes(t)
	for i := range a.A {
		a.A[i] *= 1 + 0.02*math.Sin(float64(7*i))
	}
	s, err := optics.SlopeDirect(a, 350, 400)
	if err != nil {
		t.Fatal(err)
	}
	var num, den float64
	for i, v := range a.A {
		if d := a.Axis.At(i) - 350; d >= 0 && d <= 50 {
			num, den = num+v*math.Exp(-s*d), den+math.Exp(-2*s*d)
		}
	}
	a0, g, scale := num/den, 0.0, 0.0
	for i, v := range a.A {
		if d := a.Axis.At(i) - 350; d >= 0 && d <= 50 {
			m := a0 * math.Exp(-s*d)
			g, scale = g+(v-m)*d*m, scale+math.Abs((v-m)*d*m)
		}
	}
	if math.Abs(g) > 1e-9*scale {
		t.Errorf("gradient %g of %g", g, scale)
	}
	if lin, _ := optics.Slope(a, 350, 400); lin == s {
		t.Error("both fits agree to the last bit on noisy data; one of them is not what it says")
	}
}

// TestSlopeRefused: the reasons name the wavelength.
func TestSlopeRefused(t *testing.T) {
	a := twoSlopes(t)
	a.A[a.Axis.Nearest(280)] = -0.001
	list := optics.Absorption(a, 0)
	for name, want := range map[string]string{"s_275_295": "280 nm is not positive", "s_r": "280 nm", "a254": "254 nm", "e4_e6": "465 nm"} {
		if r := byName(t, list, name); !strings.Contains(r.Refused, want) || !math.IsNaN(r.Value) {
			t.Errorf("%s: %v, %q; want a reason with %q", name, r.Value, r.Refused, want)
		}
	}
	short := &eem.Absorbance{Axis: steps(t, 275, 295, 20), A: []float64{1, 2}, PathCM: 1}
	if _, err := optics.Slope(short, 275, 295); err == nil {
		t.Error("two points gave a slope")
	}
}

// TestForms: CHK-7d (algebra): the form of Ohno 2002 is H/(1+H) of that of
// Zsolnay et al. 1999.
func TestForms(t *testing.T) {
	for _, c := range []struct{ z, ohno float64 }{{1, 0.5}, {4, 0.8}, {10, 0.9090909090909091}, {16, 0.9411764705882353}} {
		e := fill(steps(t, 250, 255, 5), steps(t, 290, 490, 5), func(_, em float64) float64 {
			if em < 400 {
				return 1
			}
			return c.z
		})
		list := optics.Fluorescence(e)
		near(t, "ratio form", byName(t, list, "hix_ratio").Value, c.z, 1e-12)
		near(t, "sum form", byName(t, list, "hix_sum").Value, c.ohno, 1e-12)
	}
}

// TestFlat: CHK-7e (computed): F = 1 everywhere.
func TestFlat(t *testing.T) {
	e := fill(steps(t, 200, 450, 5), steps(t, 250, 600, 3), func(_, _ float64) float64 { return 1 })
	list := optics.Fluorescence(e)
	for name, want := range map[string]float64{"hix_ratio": 1, "hix_sum": 0.5, "fi_470_520": 1, "fi_450_500": 1, "bix": 1, "freshness": 1, "freshness_boxes": 1} {
		near(t, name, byName(t, list, name).Value, want, 1e-12)
	}
	for _, r := range optics.Regions(e) {
		near(t, r.Name, r.Value, 20, 1e-12)
	}
}

// TestRegionsOfOwnGrid: shares do not depend on how finely a region is scanned,
// nor on cells that are missing where the intensity is even.
func TestRegionsOfOwnGrid(t *testing.T) {
	f := func(ex, em float64) float64 {
		if ex > 250 && em > 380 {
			return 3
		}
		return 1
	}
	e := fill(steps(t, 201, 399, 2), steps(t, 281, 549, 2), f)
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			if e.Em.At(k) < e.Ex.At(j)+10 {
				e.Drop(e.Index(j, k), eem.Rayleigh1)
			}
		}
	}
	for i, r := range optics.Regions(e) {
		want := 100.0 / 7
		if i == 4 {
			want = 300.0 / 7
		}
		near(t, r.Name, r.Value, want, 1e-12)
	}
}

// TestFilledWindow: more than a fifth filled refuses, a fifth does not.
func TestFilledWindow(t *testing.T) {
	e := fill(steps(t, 350, 350, 1), steps(t, 400, 500, 1), func(_, em float64) float64 { return em })
	peak := func(e *eem.EEM) optics.Index { return byName(t, optics.Fluorescence(e), "peak_c") }
	for k := range 12 { // 12 of 61
		e.Why[e.Index(0, 30+k)] = eem.Raman1
	}
	if ix := peak(e); ix.Refused != "" || ix.Value != 480 {
		t.Errorf("12 of 61 filled: %+v", ix)
	}
	e.Why[e.Index(0, 42)] = eem.Raman1
	if ix := peak(e); !strings.Contains(ix.Refused, "21 % of the window ex 350–350, em 420–480") {
		t.Errorf("13 of 61 filled: %+v", ix)
	}
	e.Drop(e.Index(0, 50), eem.Raman1)
	if ix := peak(e); !strings.Contains(ix.Refused, "no value at ex 350, em 450") {
		t.Errorf("with a gap: %+v", ix)
	}
}

// TestUncertainty: a scale that all cells share leaves a ratio alone and a peak
// not; independent errors of 1 % make a ratio of two cells uncertain by √2 %.
func TestUncertainty(t *testing.T) {
	e := fill(steps(t, 310, 310, 1), steps(t, 380, 430, 50), func(_, em float64) float64 { return em })
	e.Causes = []eem.Cause{{Name: "scale", U: 0.05}}
	bix := byName(t, optics.Fluorescence(e), "bix")
	if bix.U > 1e-15 {
		t.Errorf("shared scale: u %g", bix.U)
	}
	e.Causes, e.Var = nil, []float64{3.8 * 3.8, 4.3 * 4.3}
	bix = byName(t, optics.Fluorescence(e), "bix")
	near(t, "independent", bix.U/bix.Value, 0.01*math.Sqrt2, 1e-12)
}
