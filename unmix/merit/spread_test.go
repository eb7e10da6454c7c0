package merit_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// mixture makes a cube of mixtures of two bands on a small grid with white noise of
// known size: column f has its peak at cell centre[f].
func mixture(amounts [][]float64, centre []float64, sd float64, seed uint64) (*eem.Cube, *unmix.Set) {
	ex, _ := eem.Steps(300, 310, 10)
	em, _ := eem.Steps(400, 498, 2)
	g := eem.Grid{Ex: ex, Em: em}
	set := &unmix.Set{Grid: g, Unit: eem.Raman, Method: "references", Origin: "test"}
	for f, c := range centre {
		comp := unmix.Component{Name: string(rune('a' + f)), AmountUnit: "mg/L", Scale: 1, Ex: []float64{1, 0.5}}
		for k := range em.Len() {
			z := (em.At(k) - c) / 12
			comp.Em = append(comp.Em, math.Exp(-z*z/2))
		}
		set.Components = append(set.Components, comp)
	}
	rnd := rand.New(rand.NewPCG(seed, 1))
	c := &eem.Cube{Grid: g, Unit: eem.Raman}
	for _, a := range amounts {
		c.IDs = append(c.IDs, "b")
		for j := range ex.Len() {
			for k := range em.Len() {
				v := sd * rnd.NormFloat64()
				for f := range a {
					v += a[f] * set.Components[f].At(g, j, k)
				}
				c.X, c.Why, c.U = append(c.X, v), append(c.Why, eem.Measured), append(c.U, float32(sd))
			}
		}
	}
	return c, set
}

// spreads resolves and judges a cube.
func spreads(t *testing.T, c *eem.Cube, set *unmix.Set, src *merit.Sources) (*unmix.Resolution, []merit.Spread) {
	t.Helper()
	r, err := unmix.Quantify(c, set)
	if err != nil {
		t.Fatal(err)
	}
	return r, merit.Spreads(c, r, src)
}

// With noise alone the uncertainty is the textbook σ√[(K'K)⁻¹]_ff: that of CHK-4e,
// whose matrix is taken as one column of cells.
func TestSpreadNoise(t *testing.T) {
	var in struct{ S [][]float64 }
	var want struct {
		U []float64 `json:"u_over_sigma"`
	}
	checks(t, "merit", "CHK-4e", &in, &want)
	ex, _ := eem.NewAxis([]float64{300})
	em, _ := eem.NewAxis([]float64{400, 410, 420, 430, 440})
	g := eem.Grid{Ex: ex, Em: em}
	set := &unmix.Set{Grid: g, Unit: eem.Raman, Method: "references", Origin: "CHK-4e"}
	c := &eem.Cube{Grid: g, Unit: eem.Raman, IDs: []string{"b"}, Why: make([]eem.Reason, 5)}
	const sigma = 1e-3
	for f, s := range columns(in.S) {
		set.Components = append(set.Components, unmix.Component{Name: string(rune('a' + f)), AmountUnit: "1", Scale: 1, Surface: s,
			Ex: []float64{1}, Em: s})
	}
	for _, row := range in.S {
		c.X, c.U = append(c.X, 3*row[0]+2*row[1]), append(c.U, sigma)
	}
	_, sp := spreads(t, c, set, nil)
	for f, u := range sp[0].U {
		near(t, "u", u, sigma*want.U[f], 1e-7) // Cube.U is float32
		near(t, "critical", sp[0].Critical[f], 1.6448536269514722*u, 1e-12)
		near(t, "detection", sp[0].Detection[f], 3.2897072539029444*u, 1e-9)
		near(t, "quantification", sp[0].Quantifiable[f], 10*u, 1e-12)
	}
}

// A cause of one bottle's whole map is relative in every contribution; the root of
// the squares is what it adds, and a cause that sample and standard share, with the
// same sign on both, cancels.
func TestSharedCauses(t *testing.T) {
	amounts := [][]float64{{2, 0}, {0, 3}, {1, 1.5}}
	c, set := mixture(amounts, []float64{430, 460}, 1e-4, 3)
	var standards []unmix.Standard
	for s, name := range []string{"a", "b"} {
		standards = append(standards, unmix.Standard{ID: name, EEM: eem.FromCells(c.Grid, c.Unit, c.Sample(s)), Conc: map[string]float64{name: amounts[s][s]}})
	}
	names := []string{"a", "b"}
	set, _, err := unmix.FromStandards(c.Grid, c.Unit, names, []string{"mg/L", "mg/L"}, standards)
	if err != nil {
		t.Fatal(err)
	}
	refs := &merit.References{Weights: unmix.WeightsOf(c.Grid, names, standards), Row: []int{0, 1}}
	day := func(key string) eem.Cause {
		return eem.Cause{Name: "intensity scale", Scope: eem.OfBatch, Key: key, U: 0.05}
	}
	u := func(src merit.Sources) []float64 {
		src.References = refs
		_, sp := spreads(t, c, set, &src)
		return sp[2].U
	}
	none := u(merit.Sources{})
	same := u(merit.Sources{Causes: [][]eem.Cause{{day("1")}, {day("1")}, {day("1")}}})
	other := u(merit.Sources{Causes: [][]eem.Cause{{day("1")}, {day("1")}, {day("2")}}})
	own := u(merit.Sources{Causes: [][]eem.Cause{nil, nil, {{Name: "repeatability", Scope: eem.OfBottle, Key: "b", U: 0.03}}}})
	stock := u(merit.Sources{Stock: 0.02})
	for f, x := range amounts[2] {
		near(t, "one day: cancels", same[f], none[f], 1e-3)
		near(t, "two days: both errors", other[f], math.Sqrt(none[f]*none[f]+2*0.05*0.05*x*x), 1e-3)
		near(t, "repeatability", own[f], math.Sqrt(none[f]*none[f]+0.03*0.03*x*x), 1e-3)
		near(t, "2 % of the standards", stock[f], math.Sqrt(none[f]*none[f]+0.02*0.02*x*x), 1e-3)
	}
}

// Two components that lie 2 nm apart are reported as a sum, whose uncertainty is far
// below that of either; two that lie 40 nm apart are not.
func TestPairs(t *testing.T) {
	c, set := mixture([][]float64{{1, 2}}, []float64{440, 442}, 0.01, 5)
	r, sp := spreads(t, c, set, nil)
	if len(sp[0].Sums) != 1 {
		t.Fatalf("%d sums", len(sp[0].Sums))
	}
	s := sp[0].Sums[0]
	if math.Abs(s.Value-3) > 4*s.U || s.U > sp[0].U[0]/5 {
		t.Errorf("sum %.4f ± %.4f, single %.4f", s.Value, s.U, sp[0].U[0])
	}
	accepted := false
	accept := func(f eem.Flag) eem.Flag {
		if accepted && f.Test == "overlap" {
			f.Severity = eem.Remark
		}
		return f
	}
	limit := func(code string) float64 { v, _ := eem.FindTest(code); return v.Limit }
	bottles := []merit.Bottle{{ID: "b", Row: 0}}
	j := merit.Judge(r, sp, bottles, c.Sample, limit, accept, "test")
	if len(j.Beyond) != 1 || j.Beyond[0].Component != "a + b" || j.Contributions[0].Reported != "see a + b" || j.Contributions[0].Qualifier != unmix.Unreliable {
		t.Errorf("sum %+v, single %+v", j.Beyond, j.Contributions[0])
	}
	accepted = true
	if j := merit.Judge(r, sp, bottles, c.Sample, limit, accept, "test"); len(j.Beyond) != 0 || j.Contributions[0].Reported == "see a + b" {
		t.Errorf("accepted, and still %+v", j.Beyond)
	}
	far, set := mixture([][]float64{{1, 2}}, []float64{430, 470}, 0.01, 5)
	if _, sp := spreads(t, far, set, nil); len(sp[0].Sums) != 0 {
		t.Errorf("40 nm apart: %+v", sp[0].Sums)
	}
}

// What is not there: over many bottles without b the interval holds 0, and b is
// detected in 5 % of them; intervals near zero come from draws and start at 0.
func TestAbsent(t *testing.T) {
	const n = 600
	amounts := make([][]float64, n)
	for i := range amounts {
		amounts[i] = []float64{1, 0}
	}
	c, set := mixture(amounts, []float64{430, 450}, 0.02, 7)
	r, sp := spreads(t, c, set, &merit.Sources{})
	detected, holds := 0, 0
	for i := range n {
		if r.Value[2*i+1] > sp[i].Critical[1] {
			detected++
		}
		if sp[i].Lower[1] < 0 {
			t.Fatal("an interval below zero")
		}
		if sp[i].Lower[1] == 0 {
			holds++
		}
	}
	// 5 % ± three standard errors of 0.9 %.
	if share := float64(detected) / n; share < 0.023 || share > 0.077 {
		t.Errorf("%.2f %% detected of what is not there", 100*share)
	}
	if share := float64(holds) / n; share < 0.965 {
		t.Errorf("%.2f %% of the intervals hold 0", 100*share)
	}
}

// Where the noise is not known the scatter of the residual stands for it: the error of
// a contribution is as large as that says, the mean of squared z is 1 (400 values:
// ± 0.2 at 3 σ).
func TestSpreadUnknownNoise(t *testing.T) {
	amounts := make([][]float64, 200)
	for i := range amounts {
		amounts[i] = []float64{3, 4}
	}
	c, set := mixture(amounts, []float64{430, 455}, 0.05, 21)
	c.U = nil
	r, sp := spreads(t, c, set, nil)
	sum := 0.0
	for i := range amounts {
		for f, want := range amounts[i] {
			z := (r.Value[2*i+f] - want) / sp[i].U[f]
			sum += z * z
		}
	}
	if m := sum / 400; math.Abs(m-1) > 0.2 {
		t.Errorf("mean squared z = %.3f, want 1", m)
	}
	if sp[0].Terms[0].Cause != "scatter of the residual" {
		t.Errorf("%+v", sp[0].Terms[0])
	}
}

// Near zero, from half a standard uncertainty to three, where intervals come from
// draws: they hold the truth in 95 % of the bottles.
func TestNearZero(t *testing.T) {
	const n = 600
	const sd = 0.02
	one, set := mixture([][]float64{{1, 0}}, []float64{430, 450}, sd, 1)
	_, sp := spreads(t, one, set, nil)
	u := sp[0].U[1]
	amounts := make([][]float64, n)
	for i := range amounts {
		amounts[i] = []float64{1, u * (0.5 + 2.5*float64(i)/n)}
	}
	c, set := mixture(amounts, []float64{430, 450}, sd, 23)
	_, sp = spreads(t, c, set, nil)
	in := 0
	for i := range amounts {
		if v := amounts[i][1]; sp[i].Lower[1] <= v && v <= sp[i].Upper[1] {
			in++
		}
	}
	// 95 % ± three standard errors of 0.9 %.
	if share := float64(in) / n; share < 0.923 || share > 0.977 {
		t.Errorf("%.2f %% of %d intervals near zero hold the truth", 100*share, n)
	}
}

// A contribution that is plain itself but entangled with one near zero (estimates
// correlated by −0.9): where that one is cut at zero, the interval of the plain one
// still reaches down to where it would be with some of the other there.
func TestEntangled(t *testing.T) {
	const n, sd = 600, 0.02
	centre := []float64{430, 436}
	one, set := mixture([][]float64{{1, 1}}, centre, sd, 1)
	_, sp := spreads(t, one, set, nil)
	rho := sp[0].Cov[1] / math.Sqrt(sp[0].Cov[0]*sp[0].Cov[3])
	amounts := make([][]float64, n)
	for i := range amounts {
		amounts[i] = []float64{1, sp[0].U[1] * (0.2 + 1.8*float64(i)/n)}
	}
	c, set := mixture(amounts, centre, sd, 27)
	r, sp := spreads(t, c, set, nil)
	in, plain := 0, 0
	for i := range amounts {
		if sp[i].Lower[0] <= 1 && 1 <= sp[i].Upper[0] {
			in++
		}
		if math.Abs(r.Value[2*i]-1) <= 1.96*sp[i].U[0] {
			plain++
		}
	}
	t.Logf("correlation %.2f: %.1f %% hold the truth, %.1f %% from the standard uncertainty alone", rho, 100*float64(in)/n, 100*float64(plain)/n)
	// 95 % ± three standard errors of 0.9 %; the shortest interval of a cut distribution may hold more.
	if share := float64(in) / n; share < 0.923 || float64(plain)/n > 0.9 || len(sp[0].Sums) != 0 {
		t.Errorf("correlation %.2f: %.1f %% hold the truth, %.1f %% from the standard uncertainty alone", rho, 100*share, 100*float64(plain)/n)
	}
}

// Spectra that are not exact make what is absent look present: with errors of the
// loadings in the budget 5 % of bottles without b exceed its critical value, and 95 %
// exceed it that hold the detection limit; without them far more of the former do.
func TestLimitsLoadings(t *testing.T) {
	const n, sd, loading = 400, 1e-3, 0.01
	rnd := rand.New(rand.NewPCG(25, 1))
	_, truth := mixture(nil, []float64{430, 450}, sd, 1)
	var false1, bare, found int
	for i := range n {
		set := *truth
		set.Components = slices.Clone(truth.Components)
		for f, c := range truth.Components {
			ex, em := slices.Clone(c.Ex), slices.Clone(c.Em)
			exU, emU := make([]float64, len(ex)), make([]float64, len(em))
			for k := range em {
				emU[k] = loading
				em[k] += loading * rnd.NormFloat64()
			}
			set.Components[f].Ex, set.Components[f].Em = ex, em
			set.Components[f].ExU, set.Components[f].EmU = exU, emU
		}
		c, _ := mixture([][]float64{{1, 0}}, []float64{430, 450}, sd, uint64(i))
		r, sp := spreads(t, c, &set, nil)
		if r.Value[1] > sp[0].Critical[1] {
			false1++
		}
		with, _ := mixture([][]float64{{1, sp[0].Detection[1]}}, []float64{430, 450}, sd, uint64(i))
		at, spAt := spreads(t, with, &set, nil)
		if at.Value[1] > spAt[0].Critical[1] {
			found++
		}
		for f := range set.Components {
			set.Components[f].ExU, set.Components[f].EmU = nil, nil
		}
		if r, sp := spreads(t, c, &set, nil); r.Value[1] > sp[0].Critical[1] {
			bare++
		}
	}
	share := func(k int) float64 { return float64(k) / n }
	t.Logf("absent and detected: %.1f %%, without the loadings' errors %.1f %%; at the limit %.1f %%", 100*share(false1), 100*share(bare), 100*share(found))
	// Standard errors of 1.1 %.
	if share(false1) > 0.08 || share(found) < 0.92 || share(bare) < 0.2 {
		t.Errorf("absent and detected: %.1f %%, without the loadings' errors %.1f %%; at the limit %.1f %%", 100*share(false1), 100*share(bare), 100*share(found))
	}
}

// The sources of an empty survey, and a bottle without a usable cell, do no harm.
func TestSpreadUnusable(t *testing.T) {
	c, set := mixture([][]float64{{1, 1}, {1, 1}}, []float64{430, 460}, 0.01, 9)
	for i := range c.Cells() {
		c.X[i], c.Why[i] = math.NaN(), eem.NotMeasured
	}
	_, sp := spreads(t, c, set, nil)
	if !math.IsNaN(sp[0].U[0]) || math.IsNaN(sp[1].U[0]) {
		t.Errorf("%v %v", sp[0].U, sp[1].U)
	}
}

// Cost of the budget beside the resolution itself.
func BenchmarkSpreads(b *testing.B) {
	amounts := make([][]float64, 500)
	for i := range amounts {
		amounts[i] = []float64{1, 0.01 * float64(i%7)}
	}
	c, set := mixture(amounts, []float64{430, 460}, 0.01, 11)
	r, err := unmix.Quantify(c, set)
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		merit.Spreads(c, r, nil)
	}
}

// A bump of 10 noise on 3 × 5 cells is found with its height, place and extent.
func TestHottestSpot(t *testing.T) {
	ex, _ := eem.Steps(300, 390, 10)
	em, _ := eem.Steps(400, 490, 5)
	g := eem.Grid{Ex: ex, Em: em}
	r, u := make([]float64, g.Cells()), make([]float32, g.Cells())
	for i := range u {
		u[i] = 0.5
	}
	for j := 4; j <= 6; j++ {
		for k := 8; k <= 12; k++ {
			r[g.Index(j, k)] = 4
		}
	}
	r[g.Index(5, 10)] = 5
	r[g.Index(5, 11)] = math.NaN() // a missing cell does not end the spot
	h := merit.HottestSpot(g, r, u)
	if h.Ex != 350 || h.Em != 450 || h.Height != 5 || h.Z != 10 || h.ExSpan != 20 || h.EmSpan != 20 || h.Above != 14 {
		t.Errorf("%+v", h)
	}
}
