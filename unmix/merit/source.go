package merit

// source is one cause of one bottle: at adds to dst (n × n) the covariance of
// K'(δb − Σ x δK) at amounts x.
type source struct {
	Term
	at func(dst, x []float64)
	// What at was made of, where it is linear in the amounts: independent effects
	// [h][g], or their products summed (see mask).
	effects [][]float64
	tensor  []float64
	bias    bool // the one effect is known with its sign: W·effect·x is too much
}

// linear is a source of independent errors, each of which changes K'(δb − Σ x δK) by
// its effect times x.
func linear(effects [][]float64, n int) func(dst, x []float64) {
	return func(dst, x []float64) {
		v := make([]float64, n)
		for _, effect := range effects {
			for h := range n {
				v[h] = 0
				for g, y := range x {
					v[h] += effect[h*n+g] * y
				}
			}
			addOuter(dst, v, 1)
		}
	}
}

func (b *bottle) add(cause, scope string, df float64, text string, at func(dst, x []float64)) {
	b.sources = append(b.sources, source{Term: Term{Cause: cause, Scope: scope, DF: df, Source: text}, at: at})
}

func (b *bottle) addLinear(cause, scope string, df float64, text string, effects [][]float64) {
	b.add(cause, scope, df, text, linear(effects, b.e.n))
	b.sources[len(b.sources)-1].effects = effects
}

func (b *bottle) addTensor(cause, scope string, df float64, text string, t []float64) {
	b.add(cause, scope, df, text, tensor(t, b.e.n))
	b.sources[len(b.sources)-1].tensor = t
}

// fixed is a source that does not depend on the amounts.
func fixed(m []float64) func(dst, _ []float64) {
	return func(dst, _ []float64) { axpy(1, m, dst) }
}

// form is x't x of the first n × n of t.
func form(t, x []float64) float64 {
	v, n := 0.0, len(x)
	for g, p := range x {
		if p != 0 {
			s := 0.0
			for h, q := range x {
				s += t[g*n+h] * q
			}
			v += p * s
		}
	}
	return v
}

// both adds v to (h, h2) and (h2, h), once where they are one.
func both(dst []float64, n, h, h2 int, v float64) {
	dst[h*n+h2] += v
	if h != h2 {
		dst[h2*n+h] += v
	}
}

// tensor is a source with covariance Σ x_g x_g' t[h][h'][g][g'], given for h' ≤ h.
func tensor(t []float64, n int) func(dst, x []float64) {
	return func(dst, x []float64) {
		for h := range n {
			for h2 := range h + 1 {
				both(dst, n, h, h2, form(t[(h*n+h2)*n*n:], x))
			}
		}
	}
}
