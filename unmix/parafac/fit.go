package parafac

import (
	"context"
	"slices"
	"sync"

	"tarnlight/eem"
)

// Fit resolves the cube into the given number of components. Only cells that
// were measured count; filled ones do not. It returns an error where the data
// cannot be fitted, which says what to do, and when ctx is cancelled. A fit that
// ran out of iterations is a Result with Status Swamp and no error.
func Fit(ctx context.Context, c *eem.Cube, components int, s *Settings) (*Result, error) {
	set := s.withDefaults()
	p, err := newProblem(c, components, &set)
	if err != nil {
		return nil, err
	}
	all, err := runStarts(ctx, p.whole(), components, &set)
	if err != nil {
		return nil, err
	}
	best := all[0]
	for _, a := range all {
		if a.s.loss < best.s.loss {
			best = a
		}
	}
	r, err := conclude(ctx, c, p, best.s, &set)
	if err != nil {
		return nil, err
	}
	r.Loss = best.s.loss / p.x2
	for _, a := range all {
		r.Starts = append(r.Starts, Start{Loss: a.s.loss / p.x2, Iterations: a.s.iter, Kept: a.kept,
			Agrees: agrees(a.s, best.s)})
	}
	return r, nil
}

// conclude brings a fit to its end on the samples themselves: freezes what the
// data do not determine, takes the ridge from the rest, and finishes by
// Gauss–Newton steps, whose matrix also gives the errors.
func conclude(ctx context.Context, c *eem.Cube, p *problem, best *als, set *Settings) (*Result, error) {
	s := newALS(p.whole(), best.f, set)
	copy(s.a, best.a)
	copy(s.b, best.b)
	copy(s.c, best.c)
	s.fixB, s.fixC, s.iter, s.revived = best.fixB, best.fixC, best.iter, best.revived
	s.exactScores()
	s.damp()
	if _, err := s.iterate(ctx, set.Tol, polishIter); err != nil {
		return nil, err
	}
	n := s.newton()
	if err := n.finish(ctx); err != nil {
		return nil, err
	}
	r := s.result(c, set)
	r.Certificate = n.delta
	r.Status = Swamp
	if n.delta <= certified {
		r.Status = Converged
	}
	n.influence().tell(r)
	return r, nil
}

// outcome is one start as far as it went.
type outcome struct {
	s         *als
	kept      bool
	converged bool
}

// runStarts screens all starts and lets the best go on.
func runStarts(ctx context.Context, d *data, f int, set *Settings) ([]*outcome, error) {
	all := make([]*outcome, set.Starts)
	err := parallel(ctx, set, len(all), "starts", func(n int) (err error) {
		s := newALS(d, f, set)
		s.random(set.Seed, n, set.Hold)
		all[n] = &outcome{s: s}
		all[n].converged, err = s.iterate(ctx, set.Tol, min(screenIter, set.MaxIter))
		return err
	})
	if err != nil {
		return nil, err
	}
	best := slices.Clone(all)
	slices.SortStableFunc(best, func(x, y *outcome) int {
		if x.s.loss < y.s.loss {
			return -1
		} else if x.s.loss > y.s.loss {
			return 1
		}
		return 0
	})
	best = best[:min(goOn, len(best))]
	err = parallel(ctx, set, len(best), "best starts", func(n int) (err error) {
		o := best[n]
		o.kept = true
		if !o.converged {
			o.converged, err = o.s.iterate(ctx, set.Tol, max(0, set.MaxIter-o.s.iter))
		}
		return err
	})
	return all, err
}

// agrees says whether two starts found the same model: loss within 1e-4 and all
// spectra with congruence above 0.99 (METHODS 5.2, common practice).
func agrees(s, best *als) bool {
	if s.loss > best.loss*(1+1e-4)+roundOff*best.x2 {
		return false
	}
	b, c := columns(s.b, s.j, s.f), columns(s.c, s.k, s.f)
	rb, rc := columns(best.b, s.j, s.f), columns(best.c, s.k, s.f)
	for _, m := range Match(rb, rc, b, c) {
		if !(m.Ex > 0.99 && m.Em > 0.99) {
			return false
		}
	}
	return true
}

func columns(x []float64, n, f int) [][]float64 {
	out := make([][]float64, f)
	for g := range out {
		out[g] = make([]float64, n)
		for i := range n {
			out[g][i] = x[i*f+g]
		}
	}
	return out
}

// parallel does n pieces of work on set.Workers goroutines. The pieces must not
// depend on one another. The first error by index is returned.
func parallel(ctx context.Context, set *Settings, n int, what string, do func(int) error) error {
	errs := make([]error, n)
	next := make(chan int)
	var wg sync.WaitGroup
	var mu sync.Mutex
	done := 0
	for range min(max(1, set.Workers), n) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for i := range next {
				if errs[i] = ctx.Err(); errs[i] == nil {
					errs[i] = do(i)
				}
				mu.Lock()
				done++
				set.Progress(done, n, what)
				mu.Unlock()
			}
		}()
	}
	for i := range n {
		next <- i
	}
	close(next)
	wg.Wait()
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}
