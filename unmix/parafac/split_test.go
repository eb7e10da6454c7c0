package parafac

import (
	"fmt"
	"math"
	"os"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
)

// long says whether the slow tests run too: TARNLIGHT_LONG=1 go test.
var long = os.Getenv("TARNLIGHT_LONG") != ""

// The difference of two halves' spectra over √2 is within 10 % of their actual
// error: halves must not have seen each other's noise.
func TestHalvesTellTheirTrueError(t *testing.T) {
	sizes := map[int]int{40: 12, 200: 3}
	if long {
		sizes[1000] = 3
	}
	for samples, repeats := range sizes {
		var diff, wrong float64
		for rep := range repeats {
			m := simulation{samples: samples, nj: 14, nk: 40, comps: 3, noise: 0.02, scatter: true, seed: 300 + uint64(rep)}
			d, w := halvesError(t, simulate(m), 3)
			diff, wrong = diff+d, wrong+w
		}
		ratio := math.Sqrt(diff / 2 / (wrong / 2))
		t.Logf("%d samples: difference/√2 over actual error %.3f", samples, ratio)
		if ratio < 0.9 || ratio > 1.1 {
			t.Errorf("%d samples: difference of halves over √2 is %.2f of their actual error", samples, ratio)
		}
	}
}

// halvesError returns the mean square difference of the halves' spectra and the
// sum of their mean square errors, over one random split, at unit norm, and over
// the loadings that the mask leaves open and that are above a tenth of the peak:
// at zero the sign constraint cuts both halves' errors to one side, and their
// difference is √(1 − 1/π) of the error whatever the halves have seen.
func halvesError(t *testing.T, s *survey, f int) (diff, wrong float64) {
	set := (&Settings{Starts: 3}).withDefaults()
	p, err := newProblem(s.cube, f, &set)
	if err != nil {
		t.Fatal(err)
	}
	groups, order := p.alone(1)
	pr, err := p.prepare(t.Context(), f, quarters(groups, order), &set)
	if err != nil {
		t.Fatal(err)
	}
	all, err := runStarts(t.Context(), pr.all, f, &set, nil)
	if err != nil {
		t.Fatal(err)
	}
	r, fin, err := conclude(t.Context(), s.cube, p, all, goodEnough, &set)
	if err != nil {
		t.Fatal(err)
	}
	hs, err := pr.halvings(t.Context(), groups, &Splits{}, &set)
	if err != nil {
		t.Fatal(err)
	}
	h := hs[0]
	var ex, em [2][][]float64
	for side := range 2 {
		q, err := pr.fitHalf(t.Context(), &model{s: fin, r: r}, h.data[side], &set)
		if err != nil {
			t.Fatal(err)
		}
		ex[side], em[side] = columns(q.b, q.j, f), columns(q.c, q.k, f)
	}
	match := [2][]Pair{Match(s.ex, s.em, ex[0], em[0]), Match(s.ex, s.em, ex[1], em[1])}
	full := Match(s.ex, s.em, r.Ex, r.Em)
	for g := range f {
		for mode, truth := range [][]float64{s.ex[g], s.em[g]} {
			ok := r.exRes[full[g].B]
			got := [2][]float64{ex[0][match[0][g].B], ex[1][match[1][g].B]}
			if mode == 1 {
				ok = r.emRes[full[g].B]
				got = [2][]float64{em[0][match[0][g].B], em[1][match[1][g].B]}
			}
			tr, a, b := unitOf(only(truth, ok)), unitOf(only(got[0], ok)), unitOf(only(got[1], ok))
			for i := range tr {
				if truth[i] < 0.1 {
					continue
				}
				diff += (a[i] - b[i]) * (a[i] - b[i])
				wrong += (a[i]-tr[i])*(a[i]-tr[i]) + (b[i]-tr[i])*(b[i]-tr[i])
			}
		}
	}
	return diff, wrong
}

func unitOf(v []float64) []float64 {
	n := norm(v)
	for i := range v {
		v[i] /= n
	}
	return v
}

func choose(t testing.TB, c *eem.Cube, from, to int, s *Settings, sp *Splits) *Choice {
	t.Helper()
	ch, err := Choose(t.Context(), c, from, to, s, sp)
	if err != nil {
		t.Fatal(err)
	}
	return ch
}

// The right number passes, one more does not, and the reason is told.
func TestChoiceFindsTheNumberOfComponents(t *testing.T) {
	for seed := range uint64(2) {
		s := simulate(simulation{samples: 48, nj: 14, nk: 36, comps: 3, noise: 0.01, scatter: true, seed: 400 + seed})
		ch := choose(t, s.cube, 2, 4, &Settings{Starts: 4}, nil)
		if ch.Components != 3 {
			t.Errorf("seed %d: %s", seed, ch.Verdict)
		}
		if !strings.Contains(ch.Verdict, "3 components: all components were found") || !strings.Contains(ch.Verdict, "Not 4: ") {
			t.Errorf("verdict %q", ch.Verdict)
		}
		for n, c := range ch.Candidates {
			if c.Components != n+2 || (n > 0 && c.Gain < -1e-6) {
				t.Errorf("candidate %d: %d components, gain %g", n, c.Components, c.Gain)
			}
		}
	}
}

// Every bottle doubled as a replicate: with the replicates kept together no
// split-half congruence rises; parted they would agree on the noise.
func TestReplicatesDoNotHelpTheHalves(t *testing.T) {
	s := simulate(simulation{samples: 30, nj: 12, nk: 30, comps: 3, noise: 0.05, scatter: true, seed: 21})
	n := s.cube.Len()
	double := s.cube.Select(append(identity(n), identity(n)...))
	sp := &Splits{Group: make([]string, 2*n)}
	for i := range sp.Group {
		sp.Group[i] = fmt.Sprint(i % n)
	}
	once := choose(t, s.cube, 3, 3, nil, nil)
	twice := choose(t, double, 3, 3, nil, sp)
	if len(once.Splits) == 0 || len(once.Splits) != len(twice.Splits) {
		t.Fatalf("%d and %d splits", len(once.Splits), len(twice.Splits))
	}
	for i, a := range once.Splits {
		b := twice.Splits[i]
		if b.Ex > a.Ex+1e-6 || b.Em > a.Em+1e-6 {
			t.Errorf("%s component %d: congruences %.6f %.6f once, %.6f %.6f doubled", a.Name, a.Component, a.Ex, a.Em, b.Ex, b.Em)
		}
		if a.Name != b.Name || 2*a.First != b.First {
			t.Errorf("split %q of %d against %q of %d", a.Name, a.First, b.Name, b.First)
		}
	}
}

// halvesAgreeWith checks that the spectra of halves are those that were compared,
// and that each is near the whole survey's.
func halvesAgreeWith(t *testing.T, s Split, r *Result) {
	t.Helper()
	a, b := s.Spectra[0], s.Spectra[1]
	if ex := Congruence(only(a.Ex, r.exRes[s.Component]), only(b.Ex, r.exRes[s.Component])); math.Abs(ex-s.Ex) > 1e-12 {
		t.Errorf("excitation spectra have congruence %g, the split says %g", ex, s.Ex)
	}
	if em := Congruence(only(a.Em, r.emRes[s.Component]), only(b.Em, r.emRes[s.Component])); math.Abs(em-s.Em) > 1e-12 {
		t.Errorf("emission spectra have congruence %g, the split says %g", em, s.Em)
	}
	for _, h := range s.Spectra {
		if top := slices.Max(only(h.Em, r.EmDetermined[s.Component])); math.Abs(top-1) > 1e-12 {
			t.Errorf("the largest loading of a half is %g", top)
		}
		for k, v := range r.Em[s.Component] {
			if r.EmDetermined[s.Component][k] && math.Abs(v-h.Em[k]) > 0.1 {
				t.Errorf("emission loading %d: %g in a half, %g in all", k, h.Em[k], v)
			}
		}
	}
}

func TestSplitsByColumn(t *testing.T) {
	s := simulate(simulation{samples: 36, nj: 12, nk: 30, comps: 2, noise: 0.01, scatter: true, seed: 5})
	by := SplitBy{Name: "site", Value: make([]string, 36)}
	for i := range by.Value {
		by.Value[i] = string("ABC"[i%3])
	}
	ch := choose(t, s.cube, 2, 2, nil, &Splits{By: []SplitBy{by, {Name: "season", Value: make([]string, 36)}}})
	rows := 0
	for _, r := range ch.Splits {
		if r.Name == "site: A, C against B" {
			rows++
			halvesAgreeWith(t, r, ch.Candidates[0].Result)
			if r.First != 24 || r.Second != 12 || !r.Agrees || r.Ex < 0.99 || math.Abs(r.EmMean) > 3 {
				t.Errorf("%+v", r)
			}
		}
		if strings.Contains(r.Name, "season") {
			t.Error("a column with one value was split")
		}
	}
	if rows != 2 {
		t.Errorf("%d rows for the column's split: %+v", rows, ch.Splits)
	}
	if _, err := Choose(t.Context(), s.cube, 2, 2, nil, &Splits{By: []SplitBy{{Name: "site"}}}); err == nil {
		t.Error("a column of the wrong length is no error")
	}
}
