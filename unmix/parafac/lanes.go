package parafac

// lanes is how many samples are swept side by side. A sweep waits for its own
// last result at every step; four that do not depend on one another fill the wait.
const lanes = 4

type lane [lanes]float64

// sweepTogether updates the scores of samples whose Gram matrix is gk, each by
// the same sweeps as it would get alone, and adds their part of the loss.
func (s *als) sweepTogether(samples []int, sweeps int) {
	f, inv := s.f, s.inv
	for x := range f {
		inv[x] = 0
		if d := s.gk[x*f+x] + s.lam[x]; d > 0 {
			inv[x] = 1 / d
		}
	}
	var v, q [maxF]lane
	var at, left [lanes]int
	load := func(l int) bool {
		if len(samples) == 0 {
			return false
		}
		at[l], left[l] = samples[0], sweeps
		samples = samples[1:]
		for x := range f {
			v[x][l], q[x][l] = s.a[at[l]*f+x], s.m[at[l]*f+x]
		}
		return true
	}
	open := 0
	for l := range lanes {
		if load(l) {
			open++
		}
	}
	for open > 0 {
		most, moved := sweepLanes(v[:f], q[:f], s.gk, s.lam, inv)
		for l := range lanes {
			if left[l] == 0 {
				continue // nothing left for this lane
			}
			if left[l]--; left[l] > 0 && moved[l] > sweptEnough*most[l] {
				continue
			}
			for x := range f {
				s.a[at[l]*f+x] = v[x][l]
			}
			s.addLoss(at[l], s.gk)
			if left[l] = 0; !load(l) {
				open--
			}
		}
	}
}

// sweepLanes is sweep for the columns of v, with the sign constraint. It returns
// the sum of squares of each and of its moves.
func sweepLanes(v, q []lane, h, lam, inv []float64) (most, moved lane) {
	f := len(v)
	q, lam, inv = q[:f], lam[:f], inv[:f]
	for x := range v {
		w, l := v[x], lam[x]
		g0, g1, g2, g3 := q[x][0]-l*w[0], q[x][1]-l*w[1], q[x][2]-l*w[2], q[x][3]-l*w[3]
		for y, hv := range h[x*f:][:f] {
			u := &v[y]
			g0 -= hv * u[0]
			g1 -= hv * u[1]
			g2 -= hv * u[2]
			g3 -= hv * u[3]
		}
		to := lane{w[0] + g0*inv[x], w[1] + g1*inv[x], w[2] + g2*inv[x], w[3] + g3*inv[x]}
		for l, t := range to {
			if t < 0 {
				t = 0
			}
			d := t - w[l]
			most[l] += t * t
			moved[l] += d * d
			v[x][l] = t
		}
	}
	return most, moved
}
