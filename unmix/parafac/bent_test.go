package parafac

import "testing"

// A component that a third of the samples lack: with bounds its score there is half
// the noise, and the loadings give way. By how much is what a fit with signs free
// gives, which the one step of Bent foretells but for what is of second order.
func TestBent(t *testing.T) {
	const f = 3
	for seed := range uint64(3) {
		s := simulate(simulation{samples: 30, nj: 12, nk: 30, comps: f, noise: 0.02, seed: 40 + seed})
		for i := 0; i < s.cube.Len(); i += 3 {
			x := s.cube.Sample(i)
			for q := range x {
				x[q] -= s.a[i*f+1] * s.ex[1][q/30] * s.em[1][q%30]
			}
		}
		r, free := fit(t, s.cube, f, nil), fit(t, s.cube, f, &Settings{Unconstrained: true})
		ex, em := r.Bent()
		if ex == nil {
			t.Fatal("no step to the fit without bounds")
		}
		var is, left float64 // squares
		for _, p := range Match(r.Ex, r.Em, free.Ex, free.Em) {
			for _, mode := range [][3][]float64{{r.Ex[p.A], free.Ex[p.B], ex[p.A]}, {r.Em[p.A], free.Em[p.B], em[p.A]}} {
				for i, v := range mode[0] {
					d := v - mode[1][i]
					is, left = is+d*d, left+(d-mode[2][i])*(d-mode[2][i])
				}
			}
		}
		t.Logf("seed %d: of what bounds do to the loadings %.1f %% is not foretold", seed, 100*left/is)
		if left > 0.02*is {
			t.Errorf("seed %d: of what bounds do to the loadings %.1f %% is not foretold", seed, 100*left/is)
		}
		if ex, _ := free.Bent(); ex != nil {
			t.Error("a fit without bounds is bent")
		}
	}
}
