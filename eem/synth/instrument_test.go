package synth

import (
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// dye has round numbers: one absorption band, one emission band.
func dye() *Fluorophore {
	return &Fluorophore{Name: "dye", Unit: "µmol/L", Absorbs: Band{PeakAt(340, 2000, 0.01)},
		Emits: Band{PeakAt(440, 1800, 1)}, Yield: 0.5}
}

// plain is an instrument that shows nothing but fluorescence: flat lamp and
// detector, no offset, no scatter to speak of at the cells looked at.
func plain() *Instrument {
	in := NewInstrument()
	flat := Band{{At: 25000, Width: 1e9, Height: 1}}
	in.Lamp, in.Detector, in.Offset, in.Saturation = flat, flat, 0, 0
	return in
}

// signal scans without noise and returns the counts at (ex, em) less the blank's.
func signal(in *Instrument, l Liquid, ex, em float64) float64 {
	return in.Scan(l, nil).Interp(ex, em) - in.Scan(Liquid{}, nil).Interp(ex, em)
}

func TestNoAbsorberIsLinear(t *testing.T) {
	in := plain()
	in.ExWindow, in.EmWindow = [2]float64{}, [2]float64{}
	d := dye()
	one := signal(in, Liquid{Doses: []Dose{{d, 1}}}, 340, 440)
	want := in.Gain * math.Ln10 * 0.01 * 0.5 / d.Emits.Area()
	if math.Abs(one/want-1) > 1e-9 {
		t.Errorf("counts %g, law %g", one, want)
	}
	for _, c := range []float64{1e-3, 0.1, 7, 200} {
		if got := signal(in, Liquid{Doses: []Dose{{d, c}}}, 340, 440); math.Abs(got/(c*one)-1) > 1e-9 {
			t.Errorf("%g µmol/L: %g, want %g", c, got, c*one)
		}
	}
}

// CHK-1a, computed from (1 − e^−x)/x: what the whole path emits against
// the linear form.
func TestWholePathFollowsLawOfFluorescence(t *testing.T) {
	in := plain()
	in.ExWindow, in.EmWindow = [2]float64{0, 1}, [2]float64{}
	d := dye()
	small := signal(in, Liquid{Doses: []Dose{{d, 1e-6}}}, 340, 440) * 1e6
	for _, c := range []struct{ x, ratio float64 }{
		{0.01, 0.995017}, {0.02, 0.990066}, {0.05, 0.975412}, {0.10, 0.951626},
		{0.115129, 0.944582}, {0.20, 0.906346}, {0.50, 0.786939}, {1.00, 0.632121},
	} {
		amount := c.x / math.Ln10 / 0.01
		got := signal(in, Liquid{Doses: []Dose{{d, amount}}}, 340, 440) / (amount * small)
		if math.Abs(got-c.ratio) > 2e-6 { // the table has six digits
			t.Errorf("x = %g: true/linear %.6f, table %.6f", c.x, got, c.ratio)
		}
	}
}

// CHK-1c, computed: inner-filter factors of the window 0.3–0.7 cm.
func TestWindowFactors(t *testing.T) {
	for _, c := range []struct{ a, k float64 }{
		{0.06, 1.07138}, {0.10, 1.12162}, {0.30, 1.40805}, {0.50, 1.76266},
		{1.00, 3.05321}, {1.50, 5.19989}, {2.00, 8.71457}, {3.00, 23.4262},
	} {
		if k := 1 / transmission(c.a, [2]float64{0.3, 0.7}); math.Abs(k/c.k-1) > 1e-5 {
			t.Errorf("A = %g: factor %.5f, table %.5f", c.a, k, c.k)
		}
		if k := 1 / transmission(c.a, [2]float64{0.5, 0.5}); math.Abs(k/math.Pow(10, c.a/2)-1) > 1e-12 {
			t.Errorf("A = %g: one depth gives %g, centre form %g", c.a, k, math.Pow(10, c.a/2))
		}
	}
	if k := transmission(0, [2]float64{0.3, 0.7}); k != 1 {
		t.Errorf("clear liquid transmits %g", k)
	}
}

// The simulated inner filter is Beer and Lambert's law integrated over the
// window: against Gauss–Legendre quadrature over the square of light paths.
func TestInnerFilterIsIntegral(t *testing.T) {
	in := plain()
	in.ExWindow, in.EmWindow = [2]float64{0.2, 0.9}, [2]float64{0.1, 0.6}
	d := dye()
	l := Liquid{Doses: []Dose{{d, 20}}, Color: Tail{At254: 1.2, Slope: 0.014}}
	free := *in
	free.ExWindow, free.EmWindow = [2]float64{}, [2]float64{}
	for _, ex := range []float64{300, 340} {
		em := 430.0
		nEx, nEm := math.Ln10*l.AbsorbanceAt(ex), math.Ln10*l.AbsorbanceAt(em)
		inner := func(x float64) float64 {
			return quad.Fixed(func(y float64) float64 { return math.Exp(-nEx*x - nEm*y) }, 0.1, 0.6, 20, nil, 0)
		}
		want := quad.Fixed(inner, 0.2, 0.9, 20, nil, 0) / (0.7 * 0.5)
		if got := signal(in, l, ex, em) / signal(&free, l, ex, em); math.Abs(got/want-1) > 1e-9 {
			t.Errorf("ex %g: transmission %g, integral %g", ex, got, want)
		}
	}
}

// The demo's window: the centre form must be right to 0.5 % at moderate
// absorbance.
func TestDemoWindowIsNearlyCentre(t *testing.T) {
	in := NewInstrument()
	for _, a := range []float64{0.05, 0.3, 0.7} {
		centre := math.Pow(10, a/2)
		if r := centre * transmission(a, in.ExWindow); math.Abs(r-1) > 0.005 {
			t.Errorf("A = %g: centre form wrong by %.2g %%", a, 100*(r-1))
		}
	}
}

func TestBandArea(t *testing.T) {
	for _, b := range []Band{{PeakAt(440, 1800, 1)}, {PeakAt(300, 2500, 2), PeakAt(280, 400, 1)}} {
		want := quad.Fixed(b.At, 150, 1500, 4000, nil, 0)
		if got := b.Area(); math.Abs(got/want-1) > 1e-4 {
			t.Errorf("area %g, quadrature %g", got, want)
		}
	}
}

// CHK-2b, computed from 10⁷/(10⁷/ex − shift): the Raman maximum of water
// lies between the two conventions, 3382 and 3400 cm⁻¹, to half a nanometre.
func TestRamanPlace(t *testing.T) {
	for _, c := range []struct{ ex, low, high float64 }{
		{275, 303.20, 303.36}, {310, 346.31, 346.52}, {350, 396.99, 397.28}, {400, 462.58, 462.96}, {450, 530.78, 531.29},
	} {
		in := plain()
		in.Ex, in.Em = axis(t, c.ex), steps(c.low-15, c.high+15, 0.05)
		row := in.Scan(Liquid{}, nil).Row(0)
		if nm := in.Em.At(peakOf(row)); nm < c.low-0.5 || nm > c.high+0.5 {
			t.Errorf("ex %g: Raman maximum at %.2f nm, expected %.2f–%.2f", c.ex, nm, c.low, c.high)
		}
	}
}

// Area law: Bartlett et al. 1998, photons, (ex₁/ex₂)^−5.3. The second-order ghost
// has SecondOrder of the area at twice the wavelength.
func TestRamanArea(t *testing.T) {
	in := plain()
	area := func(ex, from, to float64) float64 {
		in.Ex, in.Em = axis(t, ex), steps(from, to, 0.1)
		sum := 0.0
		for _, v := range in.Scan(Liquid{}, nil).Row(0) {
			sum += v * 0.1
		}
		return sum
	}
	at350 := area(350, 371, 428) // the window of Raman units
	if want := in.Gain * ramanCoefficient(350); math.Abs(at350/want-1) > 1e-3 {
		t.Errorf("Raman area %g, coefficient says %g", at350, want)
	}
	if got, want := area(275, 290, 320)/at350, math.Pow(275.0/350, -5.3); math.Abs(got/want-1) > 2e-3 {
		t.Errorf("area 275 over 350 nm: %g, law %g", got, want)
	}
	if got := area(275, 570, 650) / area(275, 290, 320); math.Abs(got/in.SecondOrder-1) > 2e-3 {
		t.Errorf("second order has %g of the first, want %g", got, in.SecondOrder)
	}
}

// The Rayleigh ridge is a Gaussian whose width is the bandpass of both
// monochromators, FWHM² = FWHM_ex² + FWHM_em²; twice the excitation's in second
// order.
func TestRayleighWidth(t *testing.T) {
	in := plain()
	in.Bandpass = [2]float64{4, 3}
	in.Ex = axis(t, 300)
	for _, c := range []struct{ at, fwhm float64 }{{300, 5}, {600, math.Hypot(8, 3)}} {
		in.Em = steps(c.at-20, c.at+20, 0.01)
		row := in.Scan(Liquid{}, nil).Row(0)
		top, above := maxOf(row), 0
		for _, v := range row {
			if v > top/2 {
				above++
			}
		}
		if got := float64(above) * 0.01; math.Abs(got-c.fwhm) > 0.03 {
			t.Errorf("ridge at %g nm is %.2f nm wide, want %.2f", c.at, got, c.fwhm)
		}
		if nm := in.Em.At(peakOf(row)); math.Abs(nm-c.at) > 0.01 {
			t.Errorf("ridge at %g nm, want %g", nm, c.at)
		}
	}
}

// A blank's counts: mean Offset + signal, variance Read² + PerPhoton·signal. 2,000
// scans of 50 cells put the standard error of a cell's variance at 3.2 %.
func TestNoise(t *testing.T) {
	in := NewInstrument()
	in.Ex, in.Em, in.PerPhoton = axis(t, 350), steps(380, 478, 2), 2
	l := Liquid{Doses: []Dose{{dye(), 0.2}}}
	clean := in.Scan(l, nil)
	rnd := rand.New(rand.NewPCG(5, 5))
	cells := make([][]float64, in.Cells())
	for range 2000 {
		for i, v := range in.Scan(l, rnd).F {
			cells[i] = append(cells[i], v)
		}
	}
	var z, ratio float64
	for i, v := range cells {
		mean, sd := stat.MeanStdDev(v, nil)
		want := in.Read*in.Read + 2*(clean.F[i]-in.Offset)
		z = max(z, math.Abs(mean-clean.F[i])/math.Sqrt(want/2000))
		ratio += sd * sd / want / float64(len(cells))
	}
	if z > 4.5 || math.Abs(ratio-1) > 0.02 {
		t.Errorf("largest z of a mean %.1f, variance ratio %.3f", z, ratio)
	}
}

func TestSaturationAndShutter(t *testing.T) {
	in := NewInstrument()
	e := in.Scan(Liquid{Doses: []Dose{{dye(), 60}}}, rand.New(rand.NewPCG(1, 1)))
	if top := maxOf(e.F); top != in.Saturation {
		t.Errorf("largest count %g, want the limit %g", top, in.Saturation)
	}
	in.Closed = true
	e = in.Scan(Liquid{Doses: []Dose{{dye(), 60}}}, rand.New(rand.NewPCG(1, 1)))
	if mean, sd := stat.MeanStdDev(e.F, nil); math.Abs(mean-in.Offset) > 0.3 || math.Abs(sd-in.Read) > 0.2 {
		t.Errorf("closed shutter: mean %g, sd %g, want %g and %g", mean, sd, in.Offset, in.Read)
	}
}

// Undoing each effect by its own law must give the ideal EEM back.
func TestIdealIsWhatCorrectionGives(t *testing.T) {
	in := NewInstrument()
	in.Saturation = 0
	l := Liquid{Doses: []Dose{{dye(), 3}}, Color: Tail{At254: 0.4, Slope: 0.015}, Turbidity: 2e-4}
	e, want := in.Scan(l, nil), in.Ideal(l)
	fEx, fEm := in.ExcitationFactors(in.Ex), in.EmissionFactors(in.Em)
	for j := range in.Ex.Len() {
		for k := range in.Em.Len() {
			ex, em := in.Ex.At(j), in.Em.At(k)
			raman := 1 / (1/ex - 3400/1e7)
			if em < ex+30 || math.Abs(em-2*ex) < 35 || math.Abs(em-raman) < 40 || math.Abs(em-2*raman) < 60 {
				continue
			}
			got := (e.At(j, k) - in.Offset) * fEx[j] * fEm[k] / (in.Gain * ramanCoefficient(350)) /
				transmission(l.AbsorbanceAt(ex), in.ExWindow) / transmission(l.AbsorbanceAt(em), in.EmWindow)
			if math.Abs(got-want.At(j, k)) > 1e-9 {
				t.Fatalf("ex %g em %g: %g RU, ideal %g", ex, em, got, want.At(j, k))
			}
		}
	}
}

func TestLiquid(t *testing.T) {
	d := dye()
	l := Liquid{Doses: []Dose{{d, 8}}, Color: Tail{At254: 1, Slope: 0.01}, Turbidity: 4e-4}
	half := l.Diluted(4)
	if got := half.AbsorbanceAt(300) / l.AbsorbanceAt(300); math.Abs(got-0.25) > 1e-12 {
		t.Errorf("diluted fourfold, absorbance × %g", got)
	}
	if l.With(Dose{d, 2}).Amount(d) != 10 || l.Amount(d) != 8 {
		t.Error("With changed its receiver or lost a dose")
	}
	p := &Photometer{Axis: steps(240, 600, 2), PathCM: 5}
	if got, want := p.Scan(l, nil).PerCM(300), l.AbsorbanceAt(300); math.Abs(got-want) > 1e-12 {
		t.Errorf("absorbance of 1 cm %g, want %g", got, want)
	}
}

func TestScanSameBytes(t *testing.T) {
	in := NewInstrument()
	l := Liquid{Doses: []Dose{{dye(), 3}}, Turbidity: 1e-4}
	a := in.Scan(l, rand.New(rand.NewPCG(7, 1)))
	b := in.Scan(l, rand.New(rand.NewPCG(7, 1)))
	if !reflect.DeepEqual(a, b) {
		t.Error("same seed, other counts")
	}
}

func BenchmarkScan(b *testing.B) {
	in := NewInstrument()
	rnd := rand.New(rand.NewPCG(1, 1))
	l := Liquid{Color: Tail{At254: 0.2, Slope: 0.015}}
	for range 6 {
		l = l.With(Dose{dye(), 0.5})
	}
	b.ReportAllocs()
	for b.Loop() {
		in.Scan(l, rnd)
	}
}

func axis(t *testing.T, nm ...float64) eem.Axis {
	t.Helper()
	a, err := eem.NewAxis(nm)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func peakOf(v []float64) int {
	at := 0
	for i := range v {
		if v[i] > v[at] {
			at = i
		}
	}
	return at
}
