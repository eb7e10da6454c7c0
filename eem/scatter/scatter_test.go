package scatter_test

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
)

func axis(t testing.TB, nm ...float64) eem.Axis {
	t.Helper()
	a, err := eem.NewAxis(nm)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func steps(t testing.TB, from, to, step float64) eem.Axis {
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
	return eem.FromCells(g, eem.Counts, v)
}

// TestLineTable: CHK-2b, computed from λ_em = 1e7/(1e7/λ_ex − Δν̃); wavelengths
// nm, shifts 3382, 3400 and 3600 cm⁻¹.
func TestLineTable(t *testing.T) {
	shifts := []float64{3382, 3400, 3600}
	for _, c := range []struct {
		ex float64
		em [3]float64
	}{
		{230, [3]float64{249.39981392605188, 249.51182469082232, 250.76319232446576}},
		{240, [3]float64{261.2011771466384, 261.3240418118467, 262.69702276707534}},
		{250, [3]float64{273.08973728767273, 273.224043715847, 274.72527472527474}},
		{254, [3]float64{277.8697932780015, 278.00884374589555, 279.5632649467289}},
		{260, [3]float64{285.06646434257095, 285.21281263712154, 286.84907325684026}},
		{270, [3]float64{297.13234274545886, 297.29134551860824, 299.06956136464333}},
		{275, [3]float64{303.19902535295125, 303.3645890788748, 305.21642619311876}},
		{280, [3]float64{309.2883716409073, 309.46065428824045, 311.38790035587186}},
		{300, [3]float64{333.87495270104836, 334.07572383073494, 336.32286995515693}},
		{310, [3]float64{346.3075792206515, 346.52358596020565, 348.94191805493017}},
		{320, [3]float64{358.8345055260514, 359.0664272890485, 361.6636528028933}},
		{330, [3]float64{371.45680857817587, 371.70533904032436, 374.489332728098}},
		{340, [3]float64{384.1755818000208, 384.4414292175486, 387.42023701002734}},
		{347.5, [3]float64{393.7786374805873, 394.0579463627601, 397.1882500857241}},
		{350, [3]float64{396.99193539239815, 397.27582292849036, 400.45766590389013}},
		{370, [3]float64{422.92191032683866, 423.24410889956533, 426.85740655283803}},
		{400, [3]float64{462.57748172818947, 462.962962962963, 467.2897196261682}},
		{420, [3]float64{489.5355938999203, 489.96733551096594, 494.8162111215834}},
		{450, [3]float64{530.7793019662424, 531.2868949232585, 536.9928400954653}},
		{488, [3]float64{584.4602557444779, 585.0757721081911, 592.0031055900622}},
	} {
		for n, s := range shifts {
			if got := (scatter.Line{Order: 1, Shift: s}).Em(c.ex); math.Abs(got-c.em[n]) > 1e-9 {
				t.Errorf("Raman %g cm⁻¹ at ex %g: %.12g nm, want %.12g", s, c.ex, got, c.em[n])
			}
		}
	}
	for ex, want := range map[float64]float64{230: 499.02364938164465, 240: 522.6480836236934, 250: 546.448087431694,
		260: 570.4256252742431, 270: 594.5826910372165, 275: 606.7291781577496} {
		if got := scatter.Raman2.Em(ex); math.Abs(got-want) > 1e-9 {
			t.Errorf("second-order Raman at ex %g: %.12g nm, want %.12g", ex, got, want)
		}
	}
	if em := scatter.Raman1.Em(3000); !math.IsInf(em, 1) { // 1e7/3000 < 3400
		t.Errorf("a shift larger than the energy gives %g nm", em)
	}
}

// halfWidth10 is all four bands 10 nm to both sides.
var halfWidth10 = []scatter.Band{
	{Line: scatter.Rayleigh1, Below: 10, Above: 10, Reason: eem.Rayleigh1},
	{Line: scatter.Rayleigh2, Below: 10, Above: 10, Reason: eem.Rayleigh2},
	{Line: scatter.Raman1, Below: 10, Above: 10, Reason: eem.Raman1},
	{Line: scatter.Raman2, Below: 10, Above: 10, Reason: eem.Raman2},
}

// TestShifts: SEC-2.6-shift (computed): the ends of the Raman windows of ex 350 nm,
// 371–428 and 382–418 nm, as shifts, by the formula of the lines turned round.
func TestShifts(t *testing.T) {
	for em, want := range map[float64]float64{371: 1617.250673854447, 428: 5206.942590120161, 382: 2393.418100224382, 418: 4647.983595352016} {
		l := scatter.Line{Order: 1, Shift: want}
		if got := l.Em(350); math.Abs(got-em) > 1e-9 {
			t.Errorf("%g cm⁻¹: em %.10g nm, want %g", want, got, em)
		}
	}
}

// TestWhichBand: CHK-3b (computed), and the sides of the first Rayleigh line.
func TestWhichBand(t *testing.T) {
	e := scatter.Mask(fill(axis(t, 275), axis(t, 250, 264.9, 265, 285, 285.1, 303, 340, 550),
		func(_, em float64) float64 { return em }), halfWidth10)
	want := []eem.Reason{eem.BelowExcitation, eem.BelowExcitation, eem.Rayleigh1, eem.Rayleigh1, eem.Measured, eem.Raman1, eem.Measured, eem.Rayleigh2}
	for k, w := range want {
		em := e.Em.At(k)
		if e.Why[k] != w || math.IsNaN(e.F[k]) != (w != eem.Measured) {
			t.Errorf("ex 275 / em %g: %v, %v; want %v", em, e.F[k], e.Why[k], w)
		}
		if w == eem.Measured && e.F[k] != em {
			t.Errorf("em %g changed to %g", em, e.F[k])
		}
	}
}

// TestBandInShift: 2400–4650 cm⁻¹ at ex 350 nm is 382–418 nm, the extent of
// water's Raman line seen on nine instruments (Appl. Spectrosc. 2011, 65, 233).
func TestBandInShift(t *testing.T) {
	b := scatter.Band{Line: scatter.Raman1, From: 2400, To: 4650, Reason: eem.Raman1}
	lo, hi := b.Range(350)
	if math.Abs(lo-382.1) > 0.05 || math.Abs(hi-418.0) > 0.05 {
		t.Errorf("%.2f–%.2f nm", lo, hi)
	}
	if lo2, hi2 := b.Range(450); hi2-lo2 <= hi-lo {
		t.Error("the band does not widen with the excitation")
	}
}

// TestFillLine: CHK-3a (i): a straight line on both sides gives that line back.
func TestFillLine(t *testing.T) {
	e := fill(axis(t, 300), steps(t, 380, 420, 4), func(_, em float64) float64 { return 2 + 0.25*em })
	for k := 2; k <= 7; k++ { // 388–408 nm
		e.Drop(k, eem.Raman1)
	}
	out := scatter.Fill(e, scatter.Interpolate)
	for k, want := range []float64{99, 100, 101, 102, 103, 104} {
		if got := out.F[k+2]; math.Abs(got-want) > 1e-12*want || out.Why[k+2] != eem.Raman1 {
			t.Errorf("em %g: %.15g (%v), want %g", out.Em.At(k+2), got, out.Why[k+2], want)
		}
	}
}

// TestFillCubic: CHK-3a (ii): six nodes, the values of SciPy's
// PchipInterpolator (slope rule of Fritsch & Carlson 1980, SIAM J. Numer. Anal.
// 17, 238). Only the cells beside a gap are asked of it, and they agree.
func TestFillCubic(t *testing.T) {
	x := []float64{380, 384, 396, 400, 408, 420}
	y := []float64{1, 1.5, 4, 4.5, 4.5, 3}
	xi := []float64{386, 390, 394, 398, 404, 410, 414, 418}
	want := []float64{1.8518518518518519, 2.75, 3.6481481481481484, 4.325, 4.5, 4.444444444444445, 4.05, 3.3888888888888884}
	nodes := axis(t, x...)
	for i, em := range xi { // one gap at a time, the other nodes measured
		var all []float64
		for _, v := range x {
			if len(all) > 0 && all[len(all)-1] < em && em < v {
				all = append(all, em)
			}
			all = append(all, v)
		}
		e := fill(axis(t, 300), axis(t, all...), func(_, at float64) float64 {
			if k, ok := nodes.Find(at); ok {
				return y[k]
			}
			return math.NaN()
		})
		k, _ := e.Em.Find(em)
		e.Why[k] = eem.Raman1
		if got := scatter.Fill(e, scatter.Interpolate).F[k]; math.Abs(got-want[i]) > 1e-12*want[i] {
			t.Errorf("em %g: %.15g, want %.15g", em, got, want[i])
		}
	}
}

// TestFillLeaves: what lies past the measured cells, or in a gap that is not
// scatter alone, stays missing; zeros go to scatter cells only.
func TestFillLeaves(t *testing.T) {
	nan := math.NaN()
	e := eem.FromCells(eem.Grid{Ex: axis(t, 300), Em: steps(t, 300, 309, 1)}, eem.Counts,
		[]float64{nan, nan, 1, nan, 2, nan, nan, 4, nan, 5})
	e.Why = []eem.Reason{eem.BelowExcitation, eem.Rayleigh1, 0, eem.Raman1, 0, eem.Raman1, eem.Saturated, 0, eem.Spike, 0}
	e.Var = []float64{nan, nan, 1, nan, 1, nan, nan, 1, nan, 1}
	out := scatter.Fill(e, scatter.Interpolate)
	for k, missing := range []bool{true, true, false, false, false, true, true, false, true, false} {
		if math.IsNaN(out.F[k]) != missing {
			t.Errorf("interpolate, cell %d: %v", k, out.F[k])
		}
	}
	if !math.IsNaN(out.Var[3]) {
		t.Error("a filled cell has a variance")
	}
	out = scatter.Fill(e, scatter.Zero)
	for k, missing := range []bool{false, false, false, false, false, false, true, false, true, false} {
		if math.IsNaN(out.F[k]) != missing {
			t.Errorf("zero, cell %d: %v", k, out.F[k])
		}
	}
	for k, w := range e.Why {
		if out.Why[k] != w {
			t.Errorf("cell %d: reason %v became %v", k, w, out.Why[k])
		}
	}
	if out = scatter.Fill(e, scatter.Missing); !math.IsNaN(out.F[3]) {
		t.Error("missing filled a cell")
	}
}

// TestMaskFillProperties, over random grids, bands and intensities:
// masking twice is masking once; the masked cells do not depend on the data;
// measured cells stay to the bit; a filled cell lies between the measured ones on
// both sides of its gap; nothing is filled past them; inputs are untouched.
func TestMaskFillProperties(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		ex := steps(t, 240, 240+10*float64(rapid.IntRange(0, 8).Draw(rt, "ex")), 10)
		em := steps(t, 250, 250+float64(rapid.IntRange(5, 200).Draw(rt, "em")), float64(rapid.IntRange(1, 5).Draw(rt, "step")))
		width := func(name string) float64 { return rapid.Float64Range(0, 25).Draw(rt, name) }
		var bands []scatter.Band
		for _, b := range halfWidth10 {
			if rapid.Bool().Draw(rt, "has "+b.Reason.String()) {
				b.Below, b.Above = width("below"), width("above")
				bands = append(bands, b)
			}
		}
		n := ex.Len() * em.Len()
		f := rapid.SliceOfN(rapid.OneOf(rapid.Float64Range(-1e6, 1e6), rapid.Just(math.NaN()), rapid.Float64Range(-1e-300, 1e-300)), n, n).Draw(rt, "f")
		e := eem.FromCells(eem.Grid{Ex: ex, Em: em}, eem.Counts, f)
		before := e.Clone()

		m := scatter.Mask(e, bands)
		flat := scatter.Mask(fill(ex, em, func(_, _ float64) float64 { return 1 }), bands)
		again := scatter.Mask(m, bands)
		for i := range m.F {
			if m.Why[i].Scatter() != flat.Why[i].Scatter() || again.Why[i] != m.Why[i] || (m.Why[i].Scatter() && !math.IsNaN(m.F[i])) {
				rt.Fatalf("cell %d: %v; of flat data %v, again %v, value %g", i, m.Why[i], flat.Why[i], again.Why[i], m.F[i])
			}
		}
		out := scatter.Fill(m, scatter.Interpolate)
		checkFill(rt, m, out)
		for i := range f {
			if math.Float64bits(e.F[i]) != math.Float64bits(before.F[i]) || e.Why[i] != before.Why[i] {
				rt.Fatalf("the input changed at %d", i)
			}
		}
	})
}

func checkFill(rt *rapid.T, m, out *eem.EEM) {
	for j := range m.Ex.Len() {
		for k := range m.Em.Len() {
			i := m.Index(j, k)
			switch {
			case m.Why[i] == eem.Measured:
				if math.Float64bits(out.F[i]) != math.Float64bits(m.F[i]) {
					rt.Fatalf("measured cell %d changed", i)
				}
			case !math.IsNaN(out.F[i]):
				lo, hi := neighbour(m, j, k, -1), neighbour(m, j, k, +1)
				slack := 1e-12 * (math.Abs(lo) + math.Abs(hi))
				if !m.Why[i].Scatter() || !(out.F[i] >= min(lo, hi)-slack && out.F[i] <= max(lo, hi)+slack) {
					rt.Fatalf("cell %d (%v) filled with %g between %g and %g", i, m.Why[i], out.F[i], lo, hi)
				}
			}
		}
	}
}

// neighbour is the next measured value along emission, NaN where there is none.
func neighbour(m *eem.EEM, j, k, step int) float64 {
	for k += step; k >= 0 && k < m.Em.Len(); k += step {
		if i := m.Index(j, k); m.Why[i] == eem.Measured {
			return m.F[i]
		}
	}
	return math.NaN()
}

// TestMaskNote: the record names the bands and what they took.
func TestMaskNote(t *testing.T) {
	e := scatter.Mask(fill(axis(t, 275), steps(t, 270, 310, 1), func(_, _ float64) float64 { return 1 }), halfWidth10)
	var s []string
	for _, p := range e.Notes[0].Params {
		s = append(s, p.Name+"="+p.Value)
	}
	got := strings.Join(s, "; ")
	for _, want := range []string{"Rayleigh first order, below/above=10/10", "Raman first order, shift=3400", "cells, Rayleigh first order=16", "cells, Raman first order=17"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q lacks %q", got, want)
		}
	}
}
