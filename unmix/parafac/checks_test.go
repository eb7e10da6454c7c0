package parafac

import (
	"math"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// tensor is a small array of the published checks: sample × second × third mode.
type tensor [][][]float64

func (x tensor) flat() []float64 {
	var out []float64
	for _, s := range x {
		for _, r := range s {
			out = append(out, r...)
		}
	}
	return out
}

func (x tensor) cube() *eem.Cube { return cubeOf(x.flat(), len(x), len(x[0]), len(x[0][0])) }

// tight are the settings of the checks: the numbers as they are, many starts.
func tight(free bool) *Settings {
	return &Settings{RawSamples: true, Unconstrained: free, Starts: 20, Tol: 1e-13, MaxIter: 5000}
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: %.12g, want %.12g to %g", what, got, want, tol)
	}
}

// jackknife is the standard error √((n−1)/n Σ(θ_i − mean)²) of leave-one-out
// values.
func jackknife(theta []float64) float64 {
	n := float64(len(theta))
	var mean, ss float64
	for _, v := range theta {
		mean += v / n
	}
	for _, v := range theta {
		ss += (v - mean) * (v - mean)
	}
	return math.Sqrt((n - 1) / n * ss)
}

// The check of the yardstick that TestStandardErrorsAgainstLeaveOneOut uses.
func TestCheck5aJackknifeOfAMean(t *testing.T) {
	var in struct{ Values []float64 }
	var want struct {
		SE float64 `json:"standard_error"`
	}
	testkit.Check(t, "CHK-5a", &in, &want)
	var sum float64
	for _, v := range in.Values {
		sum += v
	}
	var means []float64
	for _, v := range in.Values {
		means = append(means, (sum-v)/float64(len(in.Values)-1))
	}
	near(t, "standard error", jackknife(means), want.SE, 1e-12)
}

func TestCheck5bExactTensor(t *testing.T) {
	var in struct{ X tensor }
	var want struct {
		SS    float64 `json:"sum_squares"`
		Loss1 float64 `json:"rank1_loss"`
		Fit1  float64 `json:"rank1_fit_percent"`
		CC2   float64 `json:"rank2_core_consistency"`
		T     float64 `json:"triple_cosine"`
	}
	testkit.Check(t, "CHK-5b", &in, &want)
	r := fit(t, in.X.cube(), 1, tight(true))
	near(t, "sum of squares", r.SST, want.SS, 1e-9)
	near(t, "rank 1 loss", r.SSE, want.Loss1, 1e-9*want.Loss1)
	near(t, "rank 1 fit", r.Explained, want.Fit1, 1e-9*want.Fit1)
	for _, free := range []bool{true, false} {
		r = fit(t, in.X.cube(), 2, tight(free))
		near(t, "rank 2 loss", r.SSE, 0, 1e-8)
		near(t, "rank 2 core consistency", r.CoreConsistency, want.CC2, 1e-5)
		near(t, "triple cosine", r.TripleCosine, want.T, 1e-5)
	}
}

func TestCheck5cPerturbedTensor(t *testing.T) {
	var in struct{ X tensor }
	var want struct {
		Loss1  float64  `json:"rank1_loss"`
		Loss2  float64  `json:"rank2_loss"`
		Fit2   float64  `json:"rank2_fit_percent"`
		CC2    float64  `json:"rank2_core_consistency"`
		LossN  float64  `json:"rank2_nonnegative_loss"`
		FitN   float64  `json:"rank2_nonnegative_fit_percent"`
		CCN    float64  `json:"rank2_nonnegative_core_consistency"`
		CCNinB float64  `json:"rank2_nonnegative_core_consistency_scale_in_b"`
		Load   loadings `json:"rank2_loadings"`
		LoadN  loadings `json:"rank2_nonnegative_loadings"`
	}
	testkit.Check(t, "CHK-5c", &in, &want)
	c := in.X.cube()
	near(t, "rank 1 loss", fit(t, c, 1, tight(true)).SSE, want.Loss1, 1e-9*want.Loss1)
	r := fit(t, c, 2, tight(true))
	near(t, "rank 2 loss", r.SSE, want.Loss2, 1e-9*want.Loss2)
	near(t, "rank 2 fit", r.Explained, want.Fit2, 1e-9*want.Fit2)
	near(t, "rank 2 core consistency", r.CoreConsistency, want.CC2, 1e-5)
	want.Load.compare(t, r)
	r = fit(t, c, 2, tight(false))
	near(t, "non-negative loss", r.SSE, want.LossN, 1e-9*want.LossN)
	near(t, "non-negative fit", r.Explained, want.FitN, 1e-9*want.FitN)
	near(t, "non-negative core consistency", r.CoreConsistency, want.CCN, 1e-5)
	want.LoadN.compare(t, r)
	a, b, cc := factors(r)
	near(t, "core consistency of the same factors", CoreConsistency(c.X, a, b, cc, 2), want.CCN, 1e-5)
	for f := range 2 { // the scale moved from a into b
		s := math.Sqrt(columnSquare(a, len(a)/2, 2, f))
		scaleColumn(a, f, 1/s)
		scaleColumn(b, f, s)
	}
	near(t, "core consistency with the scale in b", CoreConsistency(c.X, a, b, cc, 2), want.CCNinB, 1e-5)
}

// loadings of a check: unit norm B and C, scale in A, one column a component.
type loadings struct{ A, B, C [][]float64 }

func (l *loadings) compare(t *testing.T, r *Result) {
	t.Helper()
	a, b, c := factors(r)
	for _, m := range []struct {
		name      string
		got       []float64
		want      [][]float64
		tolerance float64
	}{{"A", a, l.A, 1e-5 * 100}, {"B", b, l.B, 1e-5}, {"C", c, l.C, 1e-5}} {
		least := math.Inf(1)
		for _, swap := range []int{0, 1} { // order of components is ours
			worst := 0.0
			for i, row := range m.want {
				for f, v := range row {
					worst = math.Max(worst, math.Abs(m.got[i*2+(f^swap)]-v))
				}
			}
			least = math.Min(least, worst)
		}
		if least > m.tolerance {
			t.Errorf("loadings %s off by %g", m.name, least)
		}
	}
}

// factors returns a with the scale and b and c at unit norm, row-major.
func factors(r *Result) (a, b, c []float64) {
	n := r.Components
	a = append(a, r.Scores...)
	b, c = make([]float64, n*r.Grid.Ex.Len()), make([]float64, n*r.Grid.Em.Len())
	for f := range n {
		nb, nc := norm(r.Ex[f]), norm(r.Em[f])
		for j, v := range r.Ex[f] {
			b[j*n+f] = v / nb
		}
		for k, v := range r.Em[f] {
			c[k*n+f] = v / nc
		}
		for i := range r.IDs {
			a[i*n+f] *= nb * nc
		}
	}
	return a, b, c
}

func scaleColumn(x []float64, f int, by float64) {
	for i := f; i < len(x); i += 2 {
		x[i] *= by
	}
}

func TestCheck5dCoreConsistencyOfGivenFactors(t *testing.T) {
	var in struct{ X1, X2 tensor }
	var want struct {
		X1 float64 `json:"core_consistency_X1"`
		X2 float64 `json:"core_consistency_X2"`
	}
	testkit.Check(t, "CHK-5d", &in, &want)
	eye := []float64{1, 0, 0, 1}
	near(t, "X1", CoreConsistency(in.X1.flat(), eye, eye, eye, 2), want.X1, 1e-10)
	near(t, "X2", CoreConsistency(in.X2.flat(), eye, eye, eye, 2), want.X2, 1e-10)
}

func TestCheck5eDegenerateTensor(t *testing.T) {
	var in struct{ T tensor }
	var want struct {
		Pairs []struct {
			N     float64
			Error float64 `json:"error_norm"`
			T     float64 `json:"triple_cosine"`
		}
		Loss float64 `json:"rank2_nonnegative_loss"`
		T    float64 `json:"rank2_nonnegative_triple_cosine"`
	}
	testkit.Check(t, "CHK-5e", &in, &want)
	for _, p := range want.Pairs { // n(x + y/n)³ − n·x³
		a := []float64{p.N, -p.N, 1, 0}
		b := []float64{1, 1, 1 / p.N, 0}
		set := (&Settings{Unconstrained: true, RawSamples: true}).withDefaults()
		pr, err := newProblem(in.T.cube(), 2, &set)
		if err != nil {
			t.Fatal(err)
		}
		s := newALS(pr.whole(), 2, &set)
		copy(s.a, a)
		copy(s.b, b)
		copy(s.c, b)
		s.modelRows()
		near(t, "error of the pair", math.Sqrt(sumSquares(s.residualOf(0))+sumSquares(s.residualOf(1))), p.Error, 1e-11)
		cos, _ := s.tripleCosine()
		near(t, "triple cosine of the pair", cos, p.T, 1e-9)
	}
	r := fit(t, in.T.cube(), 2, &Settings{Unconstrained: true, RawSamples: true, MaxIter: 2000})
	if r.TripleCosine > -0.85 {
		t.Errorf("no alarm: triple cosine %g, loss %g", r.TripleCosine, r.SSE)
	}
	r = fit(t, in.T.cube(), 2, tight(false))
	near(t, "non-negative loss", r.SSE, want.Loss, 1e-7)
	near(t, "non-negative triple cosine", r.TripleCosine, want.T, 1e-5)
}

// The loss by residuals, by the products of an iteration, and from compressed
// rows, for given factors.
func TestCheck5fLossThreeWays(t *testing.T) {
	var in5c struct{ X tensor }
	var none struct{}
	testkit.Check(t, "CHK-5c", &in5c, &none)
	var in struct{ U, A, B, C [][]float64 }
	var want struct{ Loss float64 }
	testkit.Check(t, "CHK-5f", &in, &want)
	set := (&Settings{RawSamples: true}).withDefaults()
	p, err := newProblem(in5c.X.cube(), 2, &set)
	if err != nil {
		t.Fatal(err)
	}
	// The rows of U'X as a basis; what it leaves of X is orthogonal to the model.
	b := &basis{samples: []int{0, 1, 2, 3}, u: in.U, x2: p.x2}
	b.rows = [][]float64{p.x[0], p.x[1]}
	for name, d := range map[string]*data{"products": p.whole(), "compressed": p.stacked([]*basis{b}, nil)} {
		s := newALS(d, 2, &set)
		s.eps = 0
		for _, m := range []struct {
			to   []float64
			from [][]float64
		}{{s.a, in.A}, {s.b, in.B}, {s.c, in.C}} {
			for i, row := range m.from {
				copy(m.to[i*2:], row)
			}
		}
		s.modelRows()
		s.products()
		s.loss = s.x2
		for i := range s.i {
			s.addLoss(i, s.gk)
		}
		near(t, name, s.loss, want.Loss, 1e-10*want.Loss)
		var direct float64
		for i := range s.i {
			direct += sumSquares(s.residualOf(i))
		}
		near(t, "residuals", direct, want.Loss, 1e-10*want.Loss)
	}
}

// Two components of a converged unconstrained fit have core consistency 100
// whatever the data (METHODS 5.3); non-negative ones do not.
func TestCheckCoreConsistencyOfNoise(t *testing.T) {
	var in struct{ X tensor }
	var want struct {
		Loss  float64 `json:"rank2_loss"`
		CC    float64 `json:"rank2_core_consistency"`
		LossN float64 `json:"rank2_nonnegative_loss"`
		CCN   float64 `json:"rank2_nonnegative_core_consistency"`
	}
	testkit.Check(t, "SEC-5.3-fact", &in, &want)
	r := fit(t, in.X.cube(), 2, tight(true))
	near(t, "loss", r.SSE, want.Loss, 1e-7*want.Loss)
	near(t, "core consistency", r.CoreConsistency, want.CC, 1e-4)
	r = fit(t, in.X.cube(), 2, tight(false))
	near(t, "non-negative loss", r.SSE, want.LossN, 1e-7*want.LossN)
	near(t, "non-negative core consistency", r.CoreConsistency, want.CCN, 1e-3)
}
