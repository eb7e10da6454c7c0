package correct_test

import (
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// ordinary is the grid of an ordinary EEM: 46 excitations, 151 emissions.
func ordinary(b *testing.B) (*eem.EEM, *eem.Absorbance) {
	e := scene{dark: 120, noise: 3, rayleigh: 5000, raman: 60, glow: 800}.scan(b, 1, span(240, 465, 5), span(250, 550, 2))
	g := grid(b, span(200, 700, 1), []float64{1})
	a := &eem.Absorbance{Axis: g.Ex, A: make([]float64, g.Ex.Len()), PathCM: 1}
	for i := range a.A {
		a.A[i] = 0.3 * (700 - g.Ex.At(i)) / 500
	}
	return e, a
}

func BenchmarkInnerFilter(b *testing.B) {
	e, a := ordinary(b)
	for b.Loop() {
		correct.InnerFilter(e, a, correct.Geometry{Ex: [2]float64{0.3, 0.7}, Em: [2]float64{0.3, 0.7}}, 0)
	}
}

func BenchmarkSpectral(b *testing.B) {
	e, _ := ordinary(b)
	nm := span(200, 700, 5)
	f := make([]float64, len(nm))
	for i := range f {
		f[i] = 1 + float64(i%7)
	}
	t, err := correct.NewFactors(nm, f, nil, "")
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		correct.Spectral(e, t, t)
	}
}

func BenchmarkNoLight(b *testing.B) {
	e, _ := ordinary(b)
	for b.Loop() {
		correct.NoLight(e)
	}
}
