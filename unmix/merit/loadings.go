package merit

// moves adds the covariance of the loadings: Y_l[h][g] = Σ K_h δK_g for the move of
// each sample l, their products summed.
func (m *mask) moves(e *engine) {
	n := e.n
	hx, hm := m.modeGrams(e)
	y := make([]float64, n*n)
	for l := range e.src.Loadings.Samples {
		ex, em := e.src.Loadings.Move(l)
		clear(y)
		for g := range ex { // a component that was added to the model does not move
			for h := range n {
				for j, d := range ex[g] {
					y[h*n+g] += d * hx[(j*n+h)*n+g]
				}
				for k, d := range em[g] {
					y[h*n+g] += d * hm[(k*n+h)*n+g]
				}
			}
		}
		addTensor(m.load, y, n)
	}
}

// modeGrams returns [j][h][g] = Σ_k K_h·∂K_g/∂ex_g[j] and the same by emission.
func (m *mask) modeGrams(e *engine) (hx, hm []float64) {
	n := e.n
	hx, hm = make([]float64, e.c.Ex.Len()*n*n), make([]float64, e.c.Em.Len()*n*n)
	for _, l := range m.use {
		j, k := int(e.ja[l]), int(e.ka[l])
		row := e.row(l)
		for g := range n {
			c := &e.r.Set.Components[g]
			dx, dm := c.Scale*c.Em[k], c.Scale*c.Ex[j]
			for h, x := range row {
				hx[(j*n+h)*n+g] += x * dx
				hm[(k*n+h)*n+g] += x * dm
			}
		}
	}
	return hx, hm
}

// hasLoadingU says whether components that were given bring uncertainties.
func (e *engine) hasLoadingU() bool {
	if e.src.Loadings != nil || e.r.Set.Errors != nil {
		return false
	}
	for _, c := range e.r.Set.Components {
		if c.Surface == nil && (c.ExU != nil || c.EmU != nil) {
			return true
		}
	}
	return false
}

// loadingU adds uncertainties of single loadings, each an error of its own.
func (m *mask) loadingU(e *engine) {
	n := e.n
	hx, hm := m.modeGrams(e)
	one := func(g int, u []float64, grams []float64) {
		for j, v := range u {
			if !(v > 0) {
				continue
			}
			for h := range n {
				for h2 := range h + 1 {
					m.load[((h*n+h2)*n+g)*n+g] += v * v * grams[(j*n+h)*n+g] * grams[(j*n+h2)*n+g]
				}
			}
		}
	}
	for g := range n {
		c := &e.r.Set.Components[g]
		one(g, c.ExU, hx)
		one(g, c.EmU, hm)
	}
}
