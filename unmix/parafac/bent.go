package parafac

// bent is by how far the bounds at zero hold the loadings, by entry: what they are
// less what they would be were loadings and scores of either sign, by one
// Gauss–Newton step to there. Both bounds bend to one side: a loading that is noise
// about zero loses its negative half, and where a score that is noise about zero does
// so, the loadings of the other components give way. It is nil where signs are free,
// two components share one, or the step is not determined.
func (n *newton) bent() []float64 {
	if n.free || n.shared() {
		return nil
	}
	n.free = true
	m := n.als.newton()
	m.gradient()
	m.build()
	var out []float64
	if m.factor(0, nil) && m.plain {
		out = make([]float64, len(m.at))
		for i, v := range m.solve(nil, nil) {
			out[m.theta[i]] = -v
		}
	}
	n.free = false
	n.gradient() // the scores are the bounded ones again
	return out
}

// keepBent brings that to the scale of the result.
func (in *influence) keepBent(r *Result, bent []float64, peakB, peakC []int) {
	if bent == nil {
		return
	}
	mode := func(load []float64, rows, from, x, top int) []float64 {
		_, v := in.column(load, rows, from, x)
		return atMax(func(row int) float64 { return bent[from+row*in.f+x] }, v, top)
	}
	for _, x := range r.order {
		r.bentEx = append(r.bentEx, mode(in.b, in.j, 0, x, peakB[x]))
		r.bentEm = append(r.bentEm, mode(in.c, in.k, in.nb, x, peakC[x]))
	}
}

// Bent returns by how far the bounds at zero hold the loadings, F × J and F × K at a
// maximum of 1 (loadings less what they would be without bounds, to first order); nil
// where that is not known. It is a bias: what contributions take from it has a sign.
func (r *Result) Bent() (ex, em [][]float64) { return r.bentEx, r.bentEm }
