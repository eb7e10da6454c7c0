package parafac

import (
	"context"
	"math"
)

const (
	fallsFirst = 3    // falls in a row before the first extrapolation
	mostCut    = 0.7  // a column that extrapolation would cut by more stays as it is
	deadBelow  = 1e-9 // a component below this share of the largest is dead
	roundOff   = 4e-16
)

// iterate runs updates of a, b, c in turn, extrapolating b and c along their
// last step, until the loss falls by no more than tol·loss twice in a row or max
// iterations are done. An extrapolation that raised the loss is taken back, so
// that the loss of accepted steps never rises. It says whether it converged.
func (s *als) iterate(ctx context.Context, tol float64, max int) (bool, error) {
	n, m := len(s.b), len(s.b)+len(s.c)
	plain, before := make([]float64, m), make([]float64, m)
	keep := func(x []float64) { copy(x, s.b); copy(x[n:], s.c) }
	keep(plain)
	a := append([]float64(nil), s.a...)
	last, small, falls, run := math.Inf(1), 0, 0, 0
	jumped := false
	for stop := s.iter + max; s.iter < stop; s.iter++ {
		if err := ctx.Err(); err != nil {
			return false, err
		}
		s.updateA(innerSweeps)
		if jumped && s.loss > last {
			copy(s.b, plain[:n])
			copy(s.c, plain[n:])
			copy(s.a, a)
			falls, run = 0, 0
			s.updateA(innerSweeps)
		}
		if last-s.loss <= tol*math.Abs(s.loss)+roundOff*s.x2 {
			small++
		} else {
			small, falls = 0, falls+1
		}
		last = math.Min(last, s.loss)
		if s.trace != nil {
			s.trace(s.loss)
		}
		if small == 2 {
			return true, nil
		}
		s.project()
		s.updateB(innerSweeps)
		s.updateC(innerSweeps)
		s.unit()
		if s.revive() {
			falls, last = 0, math.Inf(1)
		}
		before, plain = plain, before
		keep(plain)
		copy(a, s.a)
		jumped = falls >= fallsFirst
		if jumped {
			run++
			t := float64(run)
			s.extrapolate(s.b, s.fixB, before[:n], s.j, t/(t+3))
			s.extrapolate(s.c, s.fixC, before[n:], s.k, t/(t+3))
		}
	}
	return false, nil
}

// extrapolate moves every column of x on by beta times its last step.
func (s *als) extrapolate(x []float64, fixed []bool, before []float64, n int, beta float64) {
	for f := range s.f {
		var old, now float64
		for i := f; i < n*s.f; i += s.f {
			v := s.beyond(x[i], before[i], beta)
			old, now = old+x[i]*x[i], now+v*v
		}
		if now < (1-mostCut)*(1-mostCut)*old {
			continue
		}
		for i := f; i < n*s.f; i += s.f {
			if fixed == nil || !fixed[i] {
				x[i] = s.beyond(x[i], before[i], beta)
			}
		}
	}
}

func (s *als) beyond(x, before, beta float64) float64 {
	v := x + beta*(x-before)
	if v < 0 && !s.free {
		return 0
	}
	return v
}
