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
	pr, err := p.prepare(ctx, components, quarters(p.alone(set.Seed)), &set)
	if err != nil {
		return nil, err
	}
	all, err := runStarts(ctx, pr.all, components, &set, nil)
	if err != nil {
		return nil, err
	}
	if pr.filled {
		if all, err = pr.refill(ctx, all, &set); err != nil {
			return nil, err
		}
	}
	r, _, err := conclude(ctx, c, p, all, goodEnough, &set)
	return r, err
}

// refill fills the gaps once more, from the best start, and lets it go on.
func (pr *prepared) refill(ctx context.Context, all []*outcome, set *Settings) ([]*outcome, error) {
	best := bestOf(all)
	s := newALS(pr.whole(), best.s.f, set)
	s.take(best.s)
	s.exactScores()
	if err := pr.fill(ctx, s, set); err != nil {
		return nil, err
	}
	again := newALS(pr.all, best.s.f, set)
	again.take(s)
	_, err := again.iterate(ctx, set.Tol, polishIter)
	best.s = again
	return all, err
}

// take copies the factors of o and what goes with them.
func (s *als) take(o *als) {
	copy(s.a, o.a)
	copy(s.b, o.b)
	copy(s.c, o.c)
	s.fixB, s.fixC, s.iter, s.revived = o.fixB, o.fixC, o.iter, o.revived
}

func bestOf(all []*outcome) *outcome {
	best := all[0]
	for _, o := range all {
		if o.s.loss < best.s.loss {
			best = o
		}
	}
	return best
}

// conclude brings the best start to its end on the samples themselves: takes the
// ridge from what the data determine and finishes by Gauss–Newton steps, whose
// matrix also gives the errors.
func conclude(ctx context.Context, c *eem.Cube, p *problem, all []*outcome, enough float64, set *Settings) (*Result, *als, error) {
	best := bestOf(all).s
	s := newALS(p.whole(), best.f, set)
	starts, loss := summarise(all, best, p.x2), best.loss/p.x2
	s.take(best)
	s.exactScores()
	s.damp()
	best.dampB, best.dampC = s.dampB, s.dampC
	if _, err := best.iterate(ctx, set.Tol, polishIter); err != nil {
		return nil, nil, err
	}
	s.take(best)
	n := s.newton()
	steps := newtonSteps
	if enough > goodEnough && s.shared() { // refused anyway
		steps = 0
	}
	if err := n.finish(ctx, steps, enough); err != nil {
		return nil, nil, err
	}
	r := s.result(c, set)
	r.Starts, r.Loss, r.Certificate = starts, loss, n.delta
	r.Status = Swamp
	if n.delta <= certified {
		r.Status = Converged
	}
	n.tell(r)
	return r, s, nil
}

func summarise(all []*outcome, best *als, x2 float64) []Start {
	out := make([]Start, len(all))
	for n, o := range all {
		out[n] = Start{Loss: o.s.loss / x2, Iterations: o.s.iter, Kept: o.kept, Agrees: agrees(o.s, best)}
	}
	return out
}

// outcome is one start as far as it went.
type outcome struct {
	s         *als
	kept      bool
	converged bool
}

// runStarts screens all starts and lets the best go on. Beyond the random ones
// there is one for each component of the model above, if any, without it; a start
// that shares one component between two is then not worth going on with.
func runStarts(ctx context.Context, d *data, f int, set *Settings, above *als) ([]*outcome, error) {
	more := 0
	if above != nil {
		more = above.f
	}
	all := make([]*outcome, set.Starts+more)
	err := parallel(ctx, set, len(all), "starts", func(n int) (err error) {
		s := newALS(d, f, set)
		if n < set.Starts {
			s.random(set.Seed, n, set.Hold)
		} else {
			s.without(above, n-set.Starts, set.Hold)
		}
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
		for !o.converged && o.s.iter < set.MaxIter && err == nil {
			o.converged, err = o.s.iterate(ctx, set.Tol, min(2*screenIter, set.MaxIter-o.s.iter))
			if above != nil && o.s.shared() {
				break
			}
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
