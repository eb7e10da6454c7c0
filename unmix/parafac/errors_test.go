package parafac

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// Standard errors from one pass over the samples against a true jackknife that
// leaves out each of 40 samples in turn.
func TestStandardErrorsAgainstLeaveOneOut(t *testing.T) {
	const f = 3
	s := simulate(simulation{samples: 40, nj: 12, nk: 26, comps: f, noise: 0.01, scatter: true, seed: 5})
	r := fit(t, s.cube, f, nil)
	var ex, em [][][]float64
	for out := range s.cube.Len() {
		q := fit(t, s.cube.Select(slices.Delete(identity(s.cube.Len()), out, out+1)), f, &Settings{Starts: 1})
		var x, m [][]float64
		for _, p := range Match(r.Ex, r.Em, q.Ex, q.Em) {
			x = append(x, unitOf(only(q.Ex[p.B], r.ExDetermined[p.A])))
			m = append(m, unitOf(only(q.Em[p.B], r.EmDetermined[p.A])))
		}
		ex, em = append(ex, x), append(em, m)
	}
	var ratio []float64
	for g := range f {
		ratio = append(ratio, seRatios(ex, g, r.Ex[g], r.ExSE[g], r.ExDetermined[g])...)
		ratio = append(ratio, seRatios(em, g, r.Em[g], r.EmSE[g], r.EmDetermined[g])...)
	}
	slices.Sort(ratio)
	n := len(ratio)
	t.Logf("standard error over jackknife, %d loadings: median %.3f, quartiles %.3f and %.3f, ends %.2f and %.2f", n, ratio[n/2], ratio[n/4], ratio[3*n/4], ratio[0], ratio[n-1])
	// The ends are loadings beside one that the sign constraint holds at zero in
	// some of the forty fits and not in others: no first order knows of that.
	if ratio[n/4] < 0.85 || ratio[n/2] < 0.9 || ratio[n/2] > 1.1 || ratio[3*n/4] > 1.15 {
		t.Errorf("median %.3f, quartiles %.3f and %.3f, want 1", ratio[n/2], ratio[n/4], ratio[3*n/4])
	}
}

// seRatios compares the errors of one component's loadings above a fiftieth of
// the peak, whose distribution is not cut at zero.
func seRatios(left [][][]float64, g int, load, se []float64, ok []bool) []float64 {
	var out []float64
	peak := norm(only(load, ok))
	for j := range load {
		if !ok[j] || load[j] < 0.02 {
			continue
		}
		theta := make([]float64, len(left))
		for i := range left {
			theta[i] = left[i][g][j]
		}
		out = append(out, se[j]/peak/jackknife(theta))
	}
	return out
}

// Errors of scores cover the truth: |score − truth| / error has a mean square
// near 1, with noise in every cell and loadings that are themselves uncertain.
func TestScoreErrorsCoverTheTruth(t *testing.T) {
	var ss, n, inside float64
	for seed := range uint64(6) {
		s := simulate(simulation{samples: 30, nj: 12, nk: 30, comps: 3, noise: 0.01, scatter: true, seed: 500 + seed})
		r := fit(t, s.cube, 3, &Settings{Starts: 3})
		for _, p := range Match(s.ex, s.em, r.Ex, r.Em) {
			for i := range s.cube.Len() {
				z := (r.Scores[i*3+p.B] - s.a[i*3+p.A]) / r.ScoreSE[i*3+p.B]
				ss, n = ss+z*z, n+1
				if math.Abs(z) < 1.96 {
					inside++
				}
			}
		}
	}
	t.Logf("root mean square of error over standard error %.3f, %.1f %% within 1.96", math.Sqrt(ss/n), 100*inside/n)
	// 540 scores, but six surveys' loadings: the coverage is known to about 4 %.
	if c := inside / n; c < 0.88 || c > 0.99 {
		t.Errorf("coverage %.3f, want 0.95", c)
	}
}

// Half of the samples and half of the excitations are much noisier than the rest.
// With the true uncertainties as weights the spectra come nearer to the truth.
func TestWeightsUseTheCellsUncertainties(t *testing.T) {
	var with, without float64
	for seed := range uint64(3) {
		s := simulate(simulation{samples: 30, nj: 12, nk: 30, comps: 3, scatter: true, seed: 600 + seed})
		c := s.cube
		rnd := rand.New(rand.NewPCG(seed, 9))
		c.U = make([]float32, len(c.X))
		for q := range c.X {
			u := 0.01
			if q/c.Cells()%2 == 0 {
				u *= 10
			}
			if q/c.Em.Len()%2 == 0 {
				u *= 5
			}
			c.U[q] = float32(u)
			c.X[q] += u * rnd.NormFloat64()
		}
		for _, w := range []bool{true, false} {
			r := fit(t, c, 3, &Settings{Weights: w, RawSamples: true, Starts: 4})
			for _, p := range Match(s.ex, s.em, r.Ex, r.Em) {
				e := 1 - congruenceWhere(s.em[p.A], r.Em[p.B], r.emRes[p.B])
				if w {
					with += e
				} else {
					without += e
				}
			}
		}
	}
	t.Logf("1 − congruence of the emission loadings, summed: %.3g with weights, %.3g without", with, without)
	if with > 0.2*without { // variances 1 : 25 : 100 : 2500
		t.Errorf("weights bring the squared error from %.3g to %.3g only", without, with)
	}
}

// The two ways to the errors of scores agree on samples without gaps.
func TestScoreErrorsByMomentsAndByMoves(t *testing.T) {
	set := (&Settings{Starts: 2}).withDefaults()
	p, err := newProblem(small(8).cube, 3, &set)
	if err != nil {
		t.Fatal(err)
	}
	all, err := runStarts(t.Context(), p.whole(), 3, &set, nil)
	if err != nil {
		t.Fatal(err)
	}
	s := bestOf(all).s
	s.damp()
	n := s.newton()
	if err := n.finish(t.Context(), newtonSteps, goodEnough); err != nil {
		t.Fatal(err)
	}
	in, f := n.influence(), 3
	ys, peaks, height := make([]float64, in.i*f*f), make([]float64, in.i*f), []float64{1, 2, 3}
	for l := range in.i {
		copy(ys[l*f*f:], in.slopes(l))
		for x := range f {
			peaks[l*f+x] = in.move(l, len(in.theta), 4*f+x)
		}
	}
	for i := range in.i {
		inv := slices.Clone(in.inverse(i))
		v, w := make([]float64, f), make([]float64, f)
		in.momentSE(v, height, inv, in.a[i*f:(i+1)*f], in.moments(ys, peaks))
		in.gappySE(w, height, inv, i, ys, peaks)
		for x := range f {
			if math.Abs(v[x]-w[x]) > 1e-9*w[x] || w[x] == 0 && in.a[i*f+x] > 0 {
				t.Errorf("sample %d component %d: variance %g by moments, %g by moves", i, x, v[x], w[x])
			}
		}
	}
}
