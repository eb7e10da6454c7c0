package correct_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"

	"tarnlight/eem/correct"
)

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s: %.15g, want %.15g", what, got, want)
	}
}

// TestCentreForm: CHK-1b, computed from 10^(A_tot/2) (Parker & Rees 1962), split
// unevenly between excitation and emission.
func TestCentreForm(t *testing.T) {
	for tot, want := range map[float64]float64{
		0.042: 1.0495424286523223, 0.1: 1.1220184543019633, 0.3: 1.4125375446227544, 0.5: 1.7782794100389228,
		1: 3.1622776601683795, 1.5: 5.623413251903491, 2: 10,
	} {
		near(t, "centre form", correct.Geometry{}.Factor(0.7*tot, 0.3*tot), want, 1e-12)
	}
}

// TestWindowForm: CHK-1c, computed: viewed stretch 0.3–0.7 cm and whole path.
func TestWindowForm(t *testing.T) {
	window := correct.Geometry{Form: correct.RightAngle, Ex: [2]float64{0.3, 0.7}, Em: [2]float64{0.3, 0.7}}
	whole := correct.Geometry{Form: correct.RightAngle, Ex: [2]float64{0, 1}, Em: [2]float64{0, 1}}
	for _, c := range []struct{ a, window, centre, whole float64 }{
		{0.06, 1.071382971312916, 1.0715193052376064, 1.0706676164705742},
		{0.1, 1.1216219639031921, 1.1220184543019633, 1.11954360381322},
		{0.3, 1.4080540525054206, 1.4125375446227544, 1.3848393113941388},
		{0.5, 1.7626623074026755, 1.7782794100389228, 1.6837369072306814},
		{1.0, 3.0532088360547442, 3.1622776601683795, 2.5584278811044956},
		{1.5, 5.199894310780334, 5.623413251903491, 3.566665506000246},
		{2.0, 8.714571613130746, 10, 4.651687056553628},
		{3.0, 23.426193084641426, 31.622776601683793, 6.914669948931069},
	} {
		for _, ex := range []bool{true, false} { // each axis alone
			ax, am := c.a, 0.0
			if !ex {
				ax, am = 0, c.a
			}
			near(t, "window", window.Factor(ax, am), c.window, 1e-12)
			near(t, "centre", correct.Geometry{}.Factor(ax, am), c.centre, 1e-12)
			near(t, "whole path", whole.Factor(ax, am), c.whole, 1e-12)
		}
	}
	if k := window.Factor(0, 0); k != 1 {
		t.Errorf("no absorbance: factor %g", k)
	}
}

// TestAgainstIntegration holds every form against the numerical integral of
// Beer–Lambert over its geometry: light of the excitation falls as
// e^(−β_ex·x), emission born at x is weakened on its way out, and the detector
// adds up the stretch it sees.
func TestAgainstIntegration(t *testing.T) {
	const n = 60 // Gauss–Legendre points; the integrands are smooth exponentials
	mean := func(f func(x float64) float64, lo, hi float64) float64 {
		return quad.Fixed(f, lo, hi, n, nil, 0) / (hi - lo)
	}
	for _, a := range [][2]float64{{0, 0}, {1e-9, 1e-7}, {0.05, 0.02}, {0.6, 0.1}, {0.1, 0.6}, {0.7, 0.7}, {1.5, 0.9}, {3, 1}, {-0.01, 0.002}} {
		bx, bm := math.Ln10*a[0], math.Ln10*a[1]
		for _, path := range []float64{1, 0.4} {
			lo, hi := 0.2*path, 0.9*path
			for _, c := range []struct {
				g    correct.Geometry
				want float64
			}{
				{correct.Geometry{Form: correct.RightAngle, Ex: [2]float64{lo, hi}, Em: [2]float64{0.1 * path, 0.5 * path}, PathCM: path},
					mean(func(x float64) float64 {
						return math.Exp(-bx*x) * mean(func(y float64) float64 { return math.Exp(-bm * y) }, 0.1*path, 0.5*path)
					}, lo, hi)},
				{correct.Geometry{Form: correct.FrontFace, PathCM: path},
					mean(func(x float64) float64 { return math.Exp(-bx*x) * math.Exp(-bm*x) }, 0, path)},
				{correct.Geometry{Form: correct.FrontFace, Ex: [2]float64{lo, hi}, PathCM: path},
					mean(func(x float64) float64 { return math.Exp(-bx*x) * math.Exp(-bm*x) }, lo, hi)},
				{correct.Geometry{Form: correct.Transmission, PathCM: path},
					mean(func(x float64) float64 { return math.Exp(-bx*x) * math.Exp(-bm*(path-x)) }, 0, path)},
				{correct.Geometry{Form: correct.Transmission, Ex: [2]float64{lo, hi}, PathCM: path},
					mean(func(x float64) float64 { return math.Exp(-bx*x) * math.Exp(-bm*(path-x)) }, lo, hi)},
			} {
				near(t, c.g.Form, c.g.Factor(a[0], a[1])*c.want, 1, 1e-12)
			}
		}
	}
}

// TestSlantedAgainstIntegration: a ray that meets the face at an angle, traced in
// steps through the liquid. Its direction obeys Snell's law, sin θ = 1.333·sin θ′; it
// is weakened over the length of the ray and not over the depth, on the way in and on
// the way out.
func TestSlantedAgainstIntegration(t *testing.T) {
	for _, deg := range [][2]float64{{0, 0}, {30, 0}, {30, 22.5}, {60, 30}, {0, 45}, {80, 10}} {
		along := func(depth, deg float64) float64 { // length of a ray down to depth
			in := math.Asin(math.Sin(deg*math.Pi/180) / 1.333)
			return math.Hypot(depth, depth*math.Tan(in))
		}
		for _, a := range [][2]float64{{0, 0}, {0.3, 0.1}, {2, 1}} {
			bx, bm := math.Ln10*a[0], math.Ln10*a[1]
			front := correct.Geometry{Form: correct.FrontFace, InDeg: deg[0], OutDeg: deg[1]}
			seen := quad.Fixed(func(x float64) float64 { return math.Exp(-bx*along(x, deg[0]) - bm*along(x, deg[1])) }, 0, 1, 60, nil, 0)
			near(t, "front-face", front.Factor(a[0], a[1])*seen, 1, 1e-12)
			through := correct.Geometry{Form: correct.Transmission, InDeg: deg[0], OutDeg: deg[1]}
			seen = quad.Fixed(func(x float64) float64 { return math.Exp(-bx*along(x, deg[0]) - bm*along(1-x, deg[1])) }, 0, 1, 60, nil, 0)
			near(t, "transmission", through.Factor(a[0], a[1])*seen, 1, 1e-12)
		}
	}
}

// TestCellLength: 0.4 cm of a liquid attenuate like 1 cm of one 0.4 times as
// concentrated.
func TestCellLength(t *testing.T) {
	for _, form := range []string{correct.RightAngle, correct.FrontFace, correct.Transmission} {
		short := correct.Geometry{Form: form, PathCM: 0.4}
		near(t, form, short.Factor(0.9, 0.5), correct.Geometry{Form: form}.Factor(0.36, 0.2), 1e-13)
	}
}

// TestFactors: the table is Factor at every pair.
func TestFactors(t *testing.T) {
	ax, am := []float64{0, 0.3, 1}, []float64{0.2, 0}
	for _, form := range []string{"", correct.RightAngle, correct.FrontFace, correct.Transmission} {
		g := correct.Geometry{Form: form, Ex: [2]float64{0.2, 0.6}, Em: [2]float64{0.1, 0.3}}
		for i, f := range g.Factors(ax, am) {
			if want := g.Factor(ax[i/2], am[i%2]); f != want {
				t.Errorf("%q, %d: %g, want %g", form, i, f, want)
			}
		}
	}
}

// TestGeometryCheck: what cannot be is refused in words.
func TestGeometryCheck(t *testing.T) {
	for _, g := range []correct.Geometry{
		{Form: "sideways"}, {PathCM: -1}, {PathCM: math.NaN()}, {PathCM: math.Inf(1)},
		{Ex: [2]float64{0.7, 0.3}}, {Em: [2]float64{0.5, 1.2}}, {Ex: [2]float64{0.3, 0.7}, PathCM: 0.4}, {Ex: [2]float64{math.NaN(), 1}},
		{Form: correct.FrontFace, InDeg: 90}, {Form: correct.FrontFace, OutDeg: -1},
	} {
		if g.Check() == nil {
			t.Errorf("%+v passed", g)
		}
	}
	if err := (correct.Geometry{}).Check(); err != nil {
		t.Errorf("the zero geometry: %v", err)
	}
}
