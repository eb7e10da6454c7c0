package parafac

import (
	"encoding/csv"
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/testkit"
)

// The percentages below are those of an independent fit of the same cells, as
// given with the data; all but the amino acids are of the numbers as they are.

func aminoAcids(t testing.TB) *eem.Cube {
	return measured(t, "amino_acids", false, func(ex, em, v float64) bool { return em < ex+10 })
}

// sugar is every fourth emission point of the sugar process set, without cells
// near first- and second-order scatter and saturated ones.
func sugar(t testing.TB) *eem.Cube {
	return thinned(t, measured(t, "sugar_process", false, func(ex, em, v float64) bool {
		return em < ex+20 || math.Abs(em-2*ex) <= 15 || v > 999.9
	}), 4)
}

// thinned keeps every n-th emission point.
func thinned(t testing.TB, c *eem.Cube, n int) *eem.Cube {
	var nm []float64
	for k := 0; k < c.Em.Len(); k += n {
		nm = append(nm, c.Em.At(k))
	}
	em, err := eem.NewAxis(nm)
	if err != nil {
		t.Fatal(err)
	}
	g := eem.Grid{Ex: c.Ex, Em: em}
	out := &eem.Cube{Grid: g, Unit: c.Unit, IDs: c.IDs, X: make([]float64, c.Len()*g.Cells()), Why: make([]eem.Reason, c.Len()*g.Cells())}
	for i := range c.Len() {
		for j := range g.Ex.Len() {
			for k := range nm {
				from, to := i*c.Cells()+c.Index(j, n*k), i*g.Cells()+g.Index(j, k)
				out.X[to], out.Why[to] = c.X[from], c.Why[from]
			}
		}
	}
	return out
}

func explains(t *testing.T, what string, r *Result, least float64) {
	t.Helper()
	t.Logf("%s, %d components: %.3f %% explained, certificate %.2g, %d iterations", what, r.Components, r.Explained, r.Certificate, r.Iterations)
	if r.Explained < least || r.Status != Converged {
		t.Errorf("%s, %d components: %.3f %% explained (want %g), %s", what, r.Components, r.Explained, least, r.Status)
	}
}

func TestMeasuredAminoAcids(t *testing.T) {
	c := aminoAcids(t)
	r := fit(t, c, 3, nil)
	explains(t, "amino acids", r, 99.9)
	f, err := os.Open(testkit.Shared(t, "data", "amino_acids", "concentrations.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for name, least := range map[string]float64{"tryptophan": 0.999, "tyrosine": 0.999, "phenylalanine": 0.99} {
		best := 0.0
		for g := range 3 {
			best = math.Max(best, correlation(rows, name, r, g))
		}
		if best < least {
			t.Errorf("%s: R² %.5f, want %g", name, best, least)
		}
	}
}

// correlation is R² of the scores of component g with the column whose name
// begins with name.
func correlation(rows [][]string, name string, r *Result, g int) float64 {
	at := -1
	for n, h := range rows[0] {
		if strings.HasPrefix(strings.ToLower(h), name) {
			at = n
		}
	}
	var x, y []float64
	for i, row := range rows[1:] {
		v, _ := strconv.ParseFloat(row[at], 64)
		x, y = append(x, v), append(y, r.Scores[i*3+g])
	}
	var mx, my float64
	for i := range x {
		mx, my = mx+x[i]/float64(len(x)), my+y[i]/float64(len(x))
	}
	for i := range x {
		x[i], y[i] = x[i]-mx, y[i]-my
	}
	return math.Pow(Congruence(x, y), 2)
}

// Four components must be refused in favour of three, with the reason.
func TestMeasuredAminoAcidsChoice(t *testing.T) {
	c, starts := thinned(t, aminoAcids(t), 4), 5
	if long {
		c, starts = aminoAcids(t), 10
	}
	ch := choose(t, c, 2, 4, &Settings{Starts: starts}, nil)
	t.Log(ch.Verdict)
	if ch.Components != 3 || !strings.Contains(ch.Verdict, "Not 4: ") {
		t.Errorf("chosen %d: %s", ch.Components, ch.Verdict)
	}
}

func TestMeasuredDripWater(t *testing.T) {
	c := measured(t, "cave_dripwater", false, func(ex, em, v float64) bool { return false })
	r := fit(t, c, 5, &Settings{RawSamples: true, Starts: 4})
	explains(t, "drip water", r, 94.21)
	dark := 0
	for _, n := range r.Notes {
		if n.Test == "no-light" && n.Severity == eem.Reject {
			dark++
		}
	}
	if dark != 1 {
		t.Errorf("%d samples noted as dark, want the one that is all zero", dark)
	}
}

func TestMeasuredKineticFluorescence(t *testing.T) {
	x, shape := testkit.Npy(t, testkit.Shared(t, "data", "kinetic_fluorescence", "X_t10min.npy"))
	nk, nj := shape[1], shape[2]
	y := make([]float64, len(x))
	for n, v := range x { // sample × em × ex to sample × ex × em
		i, k, j := n/(nk*nj), n/nj%nk, n%nj
		y[(i*nj+j)*nk+k] = v
	}
	c := cubeOf(y, shape[0], nj, nk)
	explains(t, "kinetic", fit(t, c, 1, &Settings{RawSamples: true}), 98.74)
	explains(t, "kinetic", fit(t, c, 2, &Settings{RawSamples: true}), 99.84)
}

// The sugar set is hard: five components have many local optima, which differ in
// the component that takes a lone excitation. The log says how many starts reach
// the best one found, and after how many iterations; the long form asks sixty
// more whether there is a better one.
func TestMeasuredSugarProcess(t *testing.T) {
	c := sugar(t)
	explains(t, "sugar", fit(t, c, 4, &Settings{RawSamples: true}), 98.78)
	r := fit(t, c, 5, &Settings{RawSamples: true})
	explains(t, "sugar", r, 99.76)
	tellStarts(t, r)
	if !long {
		return
	}
	more := fit(t, c, 5, &Settings{RawSamples: true, Starts: 60, Seed: 1})
	tellStarts(t, more)
	if more.Loss < r.Loss*(1-1e-4) {
		t.Errorf("60 more starts find a loss of %.6f of the one of ten", more.Loss/r.Loss)
	}
}

// Without the ridge the models of six components with one left out lead to the best
// five, which random starts seldom find (NUMERICS 2f). With it the best optimum,
// 99.765 %, is another one, all of whose loadings are determined: what the six lead
// to leans on loadings that the mask leaves open, has 0.85 % more loss, and still
// 0.9 % more, 99.76 %, once only those are damped.
func TestMeasuredSugarStartsFromSix(t *testing.T) {
	set := (&Settings{RawSamples: true}).withDefaults()
	p, err := newProblem(sugar(t), 6, &set)
	if err != nil {
		t.Fatal(err)
	}
	d := p.stacked([]*basis{compress(p.x, identity(p.i), basisRank, 0)}, nil)
	start := func(f int, begin func(*als)) *als {
		s := newALS(d, f, &set)
		s.eps = 0
		begin(s)
		if _, err := s.iterate(t.Context(), 1e-8, 250); err != nil {
			t.Fatal(err)
		}
		return s
	}
	six := start(6, func(s *als) { s.random(0, 1, nil) })
	var random, left []float64
	for n := range 10 {
		random = append(random, start(5, func(s *als) { s.random(0, n, nil) }).loss)
	}
	for drop := range 6 {
		left = append(left, start(5, func(s *als) { s.without(six, drop, nil) }).loss)
	}
	best := min(slices.Min(random), slices.Min(left))
	reach := func(loss []float64) (n int) {
		for _, v := range loss {
			if v < best*(1+1e-3) {
				n++
			}
		}
		return n
	}
	t.Logf("without ridge %d of 10 random starts and %d of 6 from six components come within 0.1 %% of the best", reach(random), reach(left))
	if reach(left) < 4 {
		t.Errorf("%d of 6 starts from six components reach the best", reach(left))
	}
}

func tellStarts(t *testing.T, r *Result) {
	n, most := 0, 0
	for _, s := range r.Starts {
		if s.Loss < r.Loss*(1+1e-3) {
			n, most = n+1, max(most, s.Iterations)
		}
	}
	t.Logf("%d components: %d of %d starts come within 0.1 %% of the best loss, after at most %d iterations", r.Components, n, len(r.Starts), most)
}
