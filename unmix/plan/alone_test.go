package plan_test

import (
	"math"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix/plan"
)

// curveOf is an absorbance of two bands, at 280 and 350 nm, of heights a and b.
func curveOf(t *testing.T, a, b float64) *eem.Absorbance {
	t.Helper()
	ax, err := eem.Steps(230, 500, 2)
	if err != nil {
		t.Fatal(err)
	}
	v := ax.Values()
	for i, nm := range v {
		v[i] = a*math.Exp(-math.Pow((nm-280)/12, 2)) + b*math.Exp(-math.Pow((nm-350)/15, 2))
	}
	return &eem.Absorbance{Axis: ax, A: v, PathCM: 1}
}

func TestAlone(t *testing.T) {
	a := plan.Alone{Absorbance: curveOf(t, 0.03, 0.01), Excitation: [2]float64{240, 450}, Emission: [2]float64{300, 420}, PathCM: 1,
		Bands: prepare.Bands(survey.Default().Scatter)}
	m := a.Maxima()
	if len(m) != 2 || m[0].ExNM != 280 || m[1].ExNM != 350 || m[0].Edge {
		t.Fatalf("%+v", m)
	}
	// ln(10)·0.03 = 0.0691, computed; textbooks take emission as proportional below 0.05.
	if math.Abs(m[0].X-0.069077553) > 1e-8 || math.Abs(m[0].A-0.03) > 1e-8 || m[1].X > 0.05 {
		t.Errorf("x = %g, A = %g", m[0].X, m[0].A)
	}
	// Water's Raman line of ex 280 lies at 309.5 nm by 1/(1/280 − 3400e-7), in the window.
	if len(m[0].Taken) == 0 || !(m[0].Lost > 0) || !(m[0].Lost < 0.5) {
		t.Errorf("%+v", m[0])
	}
	raman := false
	for _, o := range m[0].Taken {
		raman = raman || o.Reason == eem.Raman1 && o.From < 309.5 && o.To > 309.5
	}
	if !raman {
		t.Errorf("%+v", m[0].Taken)
	}
	clear, ok := a.Clear()
	t.Logf("maxima %.0f and %.0f nm; %.0f %% of the window lost at the first; clear of bands: %.0f nm (A %.4f)", m[0].ExNM, m[1].ExNM, 100*m[0].Lost, clear.ExNM, clear.A)
	if !ok || len(clear.Taken) > 0 || clear.A >= m[0].A {
		t.Errorf("%v %+v", ok, clear)
	}
	a.Excitation = [2]float64{285, 300}
	if m := a.Maxima(); len(m) != 1 || m[0].ExNM != 286 || !m[0].Edge {
		t.Errorf("%+v", m)
	}
	a.Excitation = [2]float64{600, 700}
	if m := a.Maxima(); m != nil {
		t.Errorf("%+v", m)
	}
}
