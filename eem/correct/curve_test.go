package correct_test

import (
	"math"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

func curve(t *testing.T, name string, from, to, step float64, f func(nm float64) float64, rel float64) correct.Curve {
	t.Helper()
	ax, err := eem.Steps(from, to, step)
	if err != nil {
		t.Fatal(err)
	}
	c := correct.Curve{Axis: ax, Source: name}
	for i := range ax.Len() {
		v := f(ax.At(i))
		c.Y = append(c.Y, v)
		if rel > 0 {
			c.U = append(c.U, rel*v)
		}
	}
	return c
}

// TestPhotons: CHK-2a (computed): energy to photon units, normalised at 450 nm.
func TestPhotons(t *testing.T) {
	c := curve(t, "lamp", 400, 600, 50, func(float64) float64 { return 1 }, 0.01)
	p := c.Photons(450)
	for nm, want := range map[float64]float64{400: 0.8888888888888888, 450: 1, 600: 1.3333333333333333} {
		i, _ := p.Axis.Find(nm)
		near(t, "photons", p.Y[i], want, 1e-12)
		near(t, "uncertainty", p.U[i], 0.01*want, 1e-12)
		near(t, "and back", p.Energy(450).Y[i], 1, 1e-12)
	}
}

// TestFactorsFrom: an instrument of known response measures a material of known
// emission; the factors made of both undo the response, uncertainties add in
// squares.
func TestFactorsFrom(t *testing.T) {
	bell := func(nm float64) float64 { d := (nm - 460) / 50; return math.Exp(-d * d / 2) }
	response := func(nm float64) float64 { return 2000 * (1 - (nm-450)*(nm-450)/2e5) }
	cert := curve(t, "material A", 380, 600, 5, bell, 0.02)
	scan := curve(t, "scan", 400, 650, 1, func(nm float64) float64 { return bell(nm) * response(nm) }, 0.005)
	f, err := correct.FactorsFrom(cert, scan, 0)
	if err != nil {
		t.Fatal(err)
	}
	if f.Axis.First() != 400 || f.Axis.Last() != 600 { // bell(600) is 0.020 of the maximum
		t.Errorf("factors over %s", f.Axis)
	}
	for i, v := range f.Factor {
		near(t, "factor", v*response(f.Axis.At(i)), 1, 1e-12)
		near(t, "uncertainty", f.U[i]/v, math.Hypot(0.02, 0.005), 1e-12)
	}
	g := grid(t, []float64{350}, []float64{402.5, 450, 598})
	e := eem.FromCells(g, eem.Counts, []float64{response(402.5), response(450), response(598)})
	out := correct.Spectral(e, nil, f)
	for _, v := range out.F { // between the points by interpolation
		near(t, "flat light", v, 1, 1e-4)
	}
	scan.Y[100] = 0
	if _, err := correct.FactorsFrom(cert, scan, 0); err == nil || !strings.Contains(err.Error(), "500 nm") {
		t.Errorf("no light at 500 nm: %v", err)
	}
}

// TestJoin: two sections of one curve with unlike scales give the curve, in any
// order; without an overlap there is an error that names both.
func TestJoin(t *testing.T) {
	truth := func(nm float64) float64 { return 1 + (nm-400)/300 }
	section := func(name string, from, to, scale, rel float64) *correct.Factors {
		c := curve(t, name, from, to, 10, func(nm float64) float64 { return scale * truth(nm) }, rel)
		f, err := correct.NewFactors(c.Axis.Values(), c.Y, c.U, name)
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	a, b, c := section("A", 400, 500, 1, 0.01), section("B", 450, 600, 7, 0.02), section("C", 620, 700, 1, 0.01)
	for _, order := range [][]*correct.Factors{{a, b}, {b, a}} {
		f, err := correct.Join(order...)
		if err != nil {
			t.Fatal(err)
		}
		for i, v := range f.Factor {
			nm := f.Axis.At(i)
			near(t, "joined", v, truth(nm), 1e-12)
			want := map[bool]float64{true: 0.01, false: 0.02}[nm < 450]
			if nm >= 450 && nm <= 500 {
				want = 1 / math.Sqrt(1/(0.01*0.01)+1/(0.02*0.02))
			}
			near(t, "uncertainty", f.U[i]/v, want, 1e-12)
		}
	}
	if _, err := correct.Join(a, b, c); err == nil || !strings.Contains(err.Error(), "A + B (400–600 nm") || !strings.Contains(err.Error(), "C (620–700 nm") {
		t.Errorf("%v", err)
	}
	one, err := b.ScaledAt(455)
	if err != nil {
		t.Fatal(err)
	}
	ax, _ := eem.NewAxis([]float64{455})
	v, _ := one.On(ax)
	near(t, "at the reference", v[0], 1, 1e-12)
}
