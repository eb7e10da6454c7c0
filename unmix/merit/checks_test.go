package merit_test

import (
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// checks reads the inputs and the expected values of a published or recomputed
// check; sources and tolerances stand in the file.
func checks(t *testing.T, file, id string, in, want any) {
	t.Helper()
	raw, err := os.ReadFile("../../testdata/" + file + "/checks.json")
	if err != nil {
		t.Fatal(err)
	}
	var list []struct {
		ID               string
		Inputs, Expected json.RawMessage
	}
	if err := json.Unmarshal(raw, &list); err != nil {
		t.Fatal(err)
	}
	for _, c := range list {
		if c.ID != id {
			continue
		}
		for _, v := range []struct {
			raw json.RawMessage
			to  any
		}{{c.Inputs, in}, {c.Expected, want}} {
			if v.to == nil {
				continue
			}
			if err := json.Unmarshal(v.raw, v.to); err != nil {
				t.Fatalf("%s: %v", id, err)
			}
		}
		return
	}
	t.Fatalf("no check %s in testdata/%s", id, file)
}

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s: %.12g, want %.12g (relative %.2g)", what, got, want, rel)
	}
}

// Currie 1968, Anal. Chem. 40, 586, in the paired counting form.
func TestCurrieCounts(t *testing.T) {
	var in struct{ B []float64 }
	var want struct{ L_C, L_D, L_Q []float64 }
	checks(t, "merit", "CHK-6a", &in, &want)
	for i, b := range in.B {
		l := merit.CurrieCounts(b)
		near(t, "critical", l.Critical, want.L_C[i], 1e-12)
		near(t, "detection", l.Detection, want.L_D[i], 1e-12)
		near(t, "quantification", l.Quantification, want.L_Q[i], 1e-12)
	}
	l := merit.Currie(1)
	near(t, "1.645", l.Critical, 1.6448536269514722, 1e-15)
	near(t, "3.29", l.Detection, 3.2897072539029444, 1e-15)
}

// ISO 11843-2: δ(ν; 0.05, 0.05), checked with scipy.stats.nct.
func TestDelta(t *testing.T) {
	var in struct{ Nu []float64 }
	var want struct{ Delta, Approximation []float64 }
	checks(t, "merit", "CHK-6b", &in, &want)
	for i, nu := range in.Nu {
		near(t, "delta", merit.Delta(nu, 0.05, 0.05), want.Delta[i], 1e-7)
		near(t, "2t·4ν/(4ν+1)", 2*merit.TQuantile(0.95, nu)*4*nu/(4*nu+1), want.Approximation[i], 1e-7)
	}
	near(t, "infinite", merit.Delta(math.Inf(1), 0.05, 0.05), 2*1.6448536269514722, 1e-12)
}

// The published line of ISO 11843-2 in closed form: five levels twice, residuals
// of ±0.1 around 2x + 1.
func TestISO11843(t *testing.T) {
	var x, y []float64
	for i := range 5 {
		x = append(x, float64(i), float64(i))
		y = append(y, 2*float64(i)+1.1, 2*float64(i)+0.9)
	}
	got := merit.ISO11843(x, y, 1)
	s := math.Sqrt(10 * 0.01 / 8)
	root := math.Sqrt(1 + 0.1 + 4.0/20)
	near(t, "x_c", got.Critical, merit.TQuantile(0.95, 8)*s/2*root, 1e-12)
	near(t, "x_d", got.Detectable, 3.617126558895169*s/2*root, 1e-7) // δ(8), CHK-6b
	near(t, "y_c", got.Response, 1+2*got.Critical, 1e-12)
}

// Lorber 1986: net analyte signal; variance inflation is that of CHK-4e.
func TestOverlaps(t *testing.T) {
	var in struct{ S [][]float64 }
	var want struct{ SEN, SEL, VIF []float64 }
	checks(t, "merit", "CHK-6c", &in, &want)
	a := mat.NewDense(len(in.S), 2, nil)
	for i, r := range in.S {
		a.SetRow(i, r)
	}
	for f, o := range merit.Overlaps(a) {
		near(t, "SEN", o.Sensitivity, want.SEN[f], 1e-12)
		near(t, "SEL", o.Selectivity, want.SEL[f], 1e-12)
		near(t, "VIF", o.VIF, want.VIF[f], 1e-12)
	}
	twice := mat.NewDense(3, 2, []float64{1, 2, 2, 4, 3, 6})
	if o := merit.Overlaps(twice)[0]; o.Selectivity != 0 || !math.IsInf(o.VIF, 1) {
		t.Errorf("dependent columns: %+v", o)
	}
}

func TestSecondOrders(t *testing.T) {
	var in struct{ B, C [][]float64 }
	var want struct{ MKL, HCD float64 }
	checks(t, "merit", "CHK-6d", &in, &want)
	for _, s := range merit.SecondOrders(columns(in.B), columns(in.C)) {
		near(t, "all known", s.All, want.MKL, 1e-12)
		near(t, "unknown interferents", s.Unknown, want.HCD, 1e-12)
	}
}

func columns(m [][]float64) [][]float64 {
	out := make([][]float64, len(m[0]))
	for f := range out {
		for _, r := range m {
			out[f] = append(out[f], r[f])
		}
	}
	return out
}

// strd returns the residuals of a fit of the NIST StRD data sets.
func strd(t *testing.T, name string) []float64 {
	var in struct {
		Y         []float64
		X         json.RawMessage
		Intercept bool
		Model     string
	}
	checks(t, "nnls", "STRD-"+name, &in, nil)
	var rows [][]float64
	var list []float64
	switch {
	case json.Unmarshal(in.X, &list) == nil:
		for _, x := range list {
			row := []float64{x}
			if strings.HasPrefix(name, "Wampler") {
				row = []float64{x, x * x, x * x * x, x * x * x * x, x * x * x * x * x}
			}
			if name == "Pontius" {
				row = []float64{x, x * x}
			}
			rows = append(rows, row)
		}
	default:
		if err := json.Unmarshal(in.X, &rows); err != nil {
			t.Fatal(err)
		}
	}
	n := len(rows[0])
	if in.Intercept {
		n++
	}
	// Columns at unit length and two rounds of refinement: the residuals, not the
	// coefficients, are what is asked.
	a := mat.NewDense(len(rows), n, nil)
	for i, r := range rows {
		if in.Intercept {
			r = append([]float64{1}, r...)
		}
		a.SetRow(i, r)
	}
	for f := range n {
		norm := mat.Norm(a.ColView(f), 2)
		for i := range rows {
			a.Set(i, f, a.At(i, f)/norm)
		}
	}
	var qr mat.QR
	qr.Factorize(a)
	res := mat.NewVecDense(len(in.Y), append([]float64(nil), in.Y...))
	for range 3 {
		var x, fit mat.VecDense
		_ = qr.SolveVecTo(&x, false, res) // a warning of the condition number at most
		fit.MulVec(a, &x)
		res.SubVec(res, &fit)
	}
	return res.RawVector().Data
}

func TestRuns(t *testing.T) {
	var want map[string]struct {
		Pos            int `json:"n_pos"`
		Neg            int `json:"n_neg"`
		Runs           int
		Mean, Variance float64
		Z              float64
	}
	checks(t, "merit", "CHK-6e", nil, &want)
	if len(want) != 5 {
		t.Fatalf("%d data sets", len(want))
	}
	for name, w := range want {
		r := merit.Runs(strd(t, name))
		if r.Positive != w.Pos || r.Negative != w.Neg || r.Runs != w.Runs {
			t.Errorf("%s: %+v, want %+v", name, r, w)
		}
		near(t, name+" mean", r.Mean, w.Mean, 1e-10)
		near(t, name+" variance", r.Variance, w.Variance, 1e-10)
		near(t, name+" Z", r.Z, w.Z, 1e-10)
	}
}

func TestDurbinWatson(t *testing.T) {
	var want map[string]float64
	checks(t, "merit", "CHK-6f", nil, &want)
	for name, w := range want {
		near(t, name, merit.DurbinWatson(strd(t, name)), w, 1e-8)
	}
}

func TestDurbinWatsonBounds(t *testing.T) {
	var want struct {
		Bounds []struct {
			N, K   int
			DL, DU float64
		}
	}
	checks(t, "merit", "CHK-6f-bounds", nil, &want)
	for _, w := range want.Bounds {
		lo, hi := merit.DurbinWatsonBounds(w.N, w.K, 0.05)
		if math.Abs(lo-w.DL) > 1e-6 || math.Abs(hi-w.DU) > 1e-6 {
			t.Errorf("n %d, k %d: %.7f %.7f, want %.7f %.7f", w.N, w.K, lo, hi, w.DL, w.DU)
		}
	}
}

// Jackson & Mudholkar 1979, Box, and exact by an Imhof integral.
func TestQLimit(t *testing.T) {
	var in struct{ Eigenvalues []float64 }
	var want struct {
		Limits map[string]struct {
			JM    float64 `json:"jackson_mudholkar"`
			Box   float64
			Exact float64
		}
	}
	checks(t, "merit", "CHK-6h", &in, &want)
	for p, w := range want.Limits {
		level := map[string]float64{"0.95": 0.95, "0.99": 0.99}[p]
		q := merit.QLimit(in.Eigenvalues, level)
		near(t, "Jackson–Mudholkar", q.JacksonMudholkar, w.JM, 1e-10)
		near(t, "Box", q.Box, w.Box, 1e-8)
		near(t, "exact", q.Exact, w.Exact, 1e-8)
	}
}

// Tracy, Young & Mason 1992.
func TestT2Limits(t *testing.T) {
	var want struct {
		Cases []struct {
			N, A     int
			New      []float64 `json:"new_95_99"`
			Training []float64 `json:"training_95_99"`
		}
	}
	checks(t, "merit", "CHK-6i", nil, &want)
	for _, w := range want.Cases {
		for i, p := range []float64{0.95, 0.99} {
			fresh, training := merit.T2Limits(w.A, w.N, p)
			near(t, "new", fresh, w.New[i], 1e-10)
			near(t, "training", training, w.Training[i], 1e-10)
		}
	}
}

func TestFromPairs(t *testing.T) {
	var in struct{ D []float64 }
	var want struct{ S float64 }
	checks(t, "merit", "CHK-9a", &in, &want)
	near(t, "s", merit.FromPairs(in.D), want.S, 1e-12)
}

// Welch–Satterthwaite, JCGM 100:2008, G.4.1: the worked example of METHODS 9.6. Its
// k is Student's 97.5 % point at ν rounded down (G.6.4), which SciPy's t.ppf and the
// printed table of t give too.
func TestSatterthwaite(t *testing.T) {
	var in struct {
		U  []float64
		Nu []*float64
	}
	var want struct {
		UC    float64 `json:"u_c"`
		U2    float64 `json:"U_k2"`
		Nu    float64 `json:"nu_eff"`
		K     float64 `json:"k_95"`
		Floor float64 `json:"k_95_nu_floor"`
	}
	checks(t, "merit", "CHK-9b", &in, &want)
	v, df, sum := make([]float64, len(in.U)), make([]float64, len(in.U)), 0.0
	for i, u := range in.U {
		v[i] = u * u
		sum += v[i]
		if in.Nu[i] != nil {
			df[i] = *in.Nu[i]
		}
	}
	nu := merit.Satterthwaite(v, df)
	near(t, "ν_eff", nu, want.Nu, 1e-10)
	near(t, "ν rounded down", math.Floor(nu), want.Floor, 0)
	near(t, "k", merit.TQuantile(0.975, math.Floor(nu)), want.K, 1e-8)
	near(t, "k at ν itself", merit.TQuantile(0.975, nu), 2.1132346878958286, 1e-8) // scipy.stats.t.ppf(0.975, 16.6464)
	near(t, "u_c", math.Sqrt(sum), want.UC, 1e-12)
	near(t, "U", 2*math.Sqrt(sum), want.U2, 1e-12)
	if !math.IsInf(merit.Satterthwaite([]float64{1}, []float64{0}), 1) {
		t.Error("a known variance has infinite degrees of freedom")
	}
}

// Jackson & Mudholkar where h0 is below 0: the normal quantile carries its sign.
func TestQLimitNegative(t *testing.T) {
	var in struct{ Eigenvalues []float64 }
	var want struct {
		Limits map[string]struct {
			JM    float64 `json:"jackson_mudholkar"`
			Exact float64
		}
	}
	checks(t, "merit", "SEC-6.5-negative-h0", &in, &want)
	for p, level := range map[string]float64{"0.95": 0.95, "0.99": 0.99} {
		q := merit.QLimit(in.Eigenvalues, level)
		near(t, "Jackson–Mudholkar", q.JacksonMudholkar, want.Limits[p].JM, 1e-8)
		near(t, "exact", q.Exact, want.Limits[p].Exact, 1e-6)
	}
}

// Type B divisors (JCGM 100:2008, 4.3.7 and 4.3.9).
func TestTypeB(t *testing.T) {
	near(t, "rectangular", merit.Rectangular(3), math.Sqrt(3), 1e-15)
	near(t, "triangular", merit.Triangular(3), 3/math.Sqrt(6), 1e-15)
}

// A value and its expanded uncertainty end at the same decimal place, that of the second
// digit of the expanded uncertainty (JCGM 100:2008, 7.2.6: 10.057 62 Ω with u_c = 27 mΩ
// is 10.058 Ω; 7.2.2: 100.021 47 g with 0.35 mg; the others worked out by hand).
func TestRounded(t *testing.T) {
	for _, c := range []struct {
		value, u       float64
		n              int
		want, expanded string
	}{{10.05762, 0.027, 2, "10.058", "0.054"}, {100.02147, 0.00035, 2, "100.02147", "0.00070"}, {1234.5, 56, 2, "1230", "110"},
		{0.00123456, 0.000012, 2, "0.001235", "0.000024"}, {68.3, 106.6, 2, "70", "210"}, {68.3, 106.6, 1, "100", "200"}, {68.3, 106.6, 3, "68", "213"},
		{4.4, 106.6, 2, "0", "210"}, {0.957083, 0.0135, 2, "0.957", "0.027"}, {0.00137817, 0.00058, 2, "0.0014", "0.0012"},
		{2.5, 0.0498, 2, "2.50", "0.10"}, {9.123e-5, 1.23e-6, 2, "9.12e-5", "2.5e-6"}, {0.00012, 0.000012, 2, "0.000120", "0.000024"},
		{9.996e-6, 1e-8, 2, "9.996e-6", "2.0e-8"}, {9.9996e-6, 1e-8, 1, "1.000e-5", "2e-8"}, {2.3456e8, 1.2e6, 2, "2.346e+8", "2.4e+6"}, {3e-7, 2e-6, 2, "3e-7", "4.0e-6"},
		{2e-8, 2e-6, 2, "0", "4.0e-6"}, {8e-8, 2e-6, 2, "1e-7", "4.0e-6"}, {12345.6, 480, 2, "12350", "960"}, {1234.5, 5.6, 2, "1235", "11"}, {2.675, 0.05, 2, "2.68", "0.10"}, {0.37123, 0, 2, "0.3712", ""}, {213.4, math.NaN(), 2, "213.4", ""}} {
		got, expanded := merit.Rounded(c.value, 2*c.u, c.n), merit.RoundedExpanded(c.value, 2*c.u, c.n)
		if got != c.want || expanded != c.expanded {
			t.Errorf("%g with u = %g to %d digits: %s ± %s, want %s ± %s", c.value, c.u, c.n, got, expanded, c.want, c.expanded)
		}
	}
}

// The setting for the digits reaches what is a number, and nothing that is told in words.
func TestRoundReachesNumbers(t *testing.T) {
	j := merit.Judged{Contributions: []unmix.Contribution{{Value: 68.3, U: 106.6, Qualifier: "J", Reported: "70"},
		{Value: 68.3, U: 106.6, Qualifier: "J", Reported: "see a + b"}, {Value: 68.3, U: 106.6, Qualifier: "U", Reported: "< 220"}},
		Beyond: []unmix.Contribution{{Value: 0.957083, U: 0.0135, Reported: "0.957"}}}
	j.Round(1)
	for i, want := range []string{"100", "see a + b", "< 220", "0.96"} {
		if got := append(j.Contributions, j.Beyond...)[i].Reported; got != want {
			t.Errorf("%d: %s, want %s", i, got, want)
		}
	}
}
