package merit

// CauseBounds is the name of what non-negativity does to resolved loadings.
const CauseBounds = "bounds at zero"

// bounds makes the effect [h][g] of loadings that the bounds at zero hold: of
// −Σ K_h δK_g for their bias δK, so that W·effect·x is what a bottle's contributions
// are too high by. Its sign is known, which no covariance of loadings holds.
func (m *mask) bounds(e *engine) {
	l := e.src.Loadings
	if l.BentEx == nil {
		return
	}
	n := e.n
	hx, hm := m.modeGrams(e)
	m.bent = make([]float64, n*n)
	for g := range l.BentEx { // a component that was added to the model is not bent
		for h := range n {
			for j, d := range l.BentEx[g] {
				m.bent[h*n+g] -= d * hx[(j*n+h)*n+g]
			}
			for k, d := range l.BentEm[g] {
				m.bent[h*n+g] -= d * hm[(k*n+h)*n+g]
			}
		}
	}
}

// addBias adds a cause whose effect is known with its sign. In a budget it counts by
// its size; what it does to a decision is up to limits.
func (b *bottle) addBias(cause, scope, text string, effect []float64) {
	b.addLinear(cause, scope, 0, text, [][]float64{effect})
	b.sources[len(b.sources)-1].bias = true
}

// biasOf is what a source of known sign adds to the combination row of the
// contributions at amounts x.
func (s *source) biasOf(row, x []float64) float64 {
	sum, n := 0.0, len(x)
	for h, w := range row {
		for g, y := range x {
			sum += w * s.effects[0][h*n+g] * y
		}
	}
	return sum
}

// frozenBias is the effect of a bias that came with a model file: its shift of the
// contributions, F × F of the components of the file.
func (b *bottle) frozenBias(shift []float64) []float64 {
	n := b.e.n
	known := 0
	for known*known < len(shift) {
		known++
	}
	effect := make([]float64, n*n)
	for h := range n {
		for q := range known {
			axpy(b.m.gram[h*n+q], shift[q*known:(q+1)*known], effect[h*n:h*n+known])
		}
	}
	return effect
}
