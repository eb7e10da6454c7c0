package merit

import "slices"

// standards carries the errors of the standards into the references: the causes
// that they share (q), the noise of their own cells (ref) and that of their blanks
// (b1, b2).
func (m *mask) standards(e *engine) {
	n, refs := e.n, e.src.References
	of := make([][]part, len(refs.Row)) // parts by standard, s being the cause here
	m.q = make([][]float64, len(e.causes))
	for z := range e.causes {
		m.q[z] = make([]float64, n*n)
		for _, p := range e.causes[z].on {
			of[p.s] = append(of[p.s], part{z, p.cause})
		}
	}
	m.ref, m.b2 = make([]float64, n*n*n*n), make([]float64, n*n*n*n)
	m.b1, m.sums.b1 = make([][]float64, len(e.blanks)), make([][]float64, len(e.blanks))
	for d := range m.b1 {
		m.b1[d], m.sums.b1[d] = make([]float64, n*n*n), make([]float64, n)
	}
	m.sums.ref, m.sums.b2 = make([]float64, n*n), make([]float64, n*n)
	setOf := make([]int, len(refs.Row))
	for s, row := range refs.Row {
		setOf[s] = -1
		for d, key := range e.blanks {
			if key == e.blankSet(row) {
				setOf[s] = d
			}
		}
	}
	c := standardCell{e: e, setOf: setOf, cov: make([]float64, n*n), w: make([]float64, n*len(refs.Row)), blank: make([]float64, n*max(1, len(e.blanks)))}
	c.apart = make([][]float64, len(refs.Row))
	m.dose = make([][]float64, len(e.doses))
	for z := range m.dose {
		m.dose[z] = make([]float64, n*n)
	}
	for _, l := range m.use {
		c.read(l)
		c.shared(m, l, of)
		c.doses(m, l)
		c.noise(m, l)
	}
	c.apartTo(m, of)
	m.scatterTo(e)
}

// standardCell is one cell on its way into the references.
type standardCell struct {
	e     *engine
	setOf []int
	w     []float64 // [s][g]: weight of standard s in component g
	cov   []float64 // [g][g']: covariance of the components by the standards' noise
	blank []float64 // [d][g]: weight of the mean of blank set d
	// apart, of a standard with such a cause, is [j or J + k][h][g]: the change of
	// K'K_g with all cells of a wavelength.
	apart [][]float64
}

func (c *standardCell) read(l int32) {
	e, n := c.e, c.e.n
	clear(c.w)
	clear(c.blank)
	clear(c.cov)
	e.src.References.Weights.Each(e.cells[l], func(f, s int, w float64) {
		c.w[s*n+f] = w
		if d := c.setOf[s]; d >= 0 {
			c.blank[d*n+f] += w * e.factor(e.src.References.Row[s])
		}
	})
	for s, row := range e.src.References.Row {
		u := e.c.SampleU(row)
		if u == nil {
			continue
		}
		if v := float64(u[e.cells[l]]); v == v {
			addOuter(c.cov, c.w[s*n:(s+1)*n], v*v)
		}
	}
}

func (c *standardCell) shared(m *mask, l int32, of [][]part) {
	e, n := c.e, c.e.n
	k := e.row(l)
	for s, row := range e.src.References.Row {
		f := e.c.Sample(row)[e.cells[l]]
		if f != f {
			continue
		}
		for p := range of[s] {
			cause := &of[s][p].cause
			if cause.Apart {
				c.byWavelength(s, l, f)
				continue
			}
			v := relative(cause, e.ja[l], e.ka[l]) * f
			if cause.Shape != nil {
				v = cause.Shape[e.cells[l]]
			}
			if v == 0 || v != v {
				continue
			}
			q := m.q[of[s][p].s]
			for g := range n {
				if w := c.w[s*n+g] * v; w != 0 {
					for h, x := range k {
						q[h*n+g] += x * w
					}
				}
			}
		}
	}
}

// byWavelength adds cell l of standard s, which holds f, to its two wavelengths.
func (c *standardCell) byWavelength(s int, l int32, f float64) {
	e, n := c.e, c.e.n
	if c.apart[s] == nil {
		c.apart[s] = make([]float64, (e.c.Ex.Len()+e.c.Em.Len())*n*n)
	}
	k := e.row(l)
	j, m := int(e.ja[l])*n*n, (e.c.Ex.Len()+int(e.ka[l]))*n*n
	for g := range n {
		w := c.w[s*n+g] * f
		if w == 0 {
			continue
		}
		for h, x := range k {
			c.apart[s][j+h*n+g] += x * w
			c.apart[s][m+h*n+g] += x * w
		}
	}
}

// apartTo sums the products of what single wavelengths of the standards do.
func (c *standardCell) apartTo(m *mask, of [][]part) {
	n := c.e.n
	y := make([]float64, n*n)
	for s, sum := range c.apart {
		for p := range of[s] {
			cause := &of[s][p].cause
			if !cause.Apart {
				continue
			}
			if m.apart == nil {
				m.apart = make([]float64, n*n*n*n)
			}
			for i, u := range append(slices.Clone(cause.Ex), cause.Em...) {
				for x := range y {
					y[x] = u * sum[i*n*n+x]
				}
				addTensor(m.apart, y, n)
			}
		}
	}
}

func (c *standardCell) noise(m *mask, l int32) {
	n := c.e.n
	k := c.e.row(l)
	axpy(1, c.cov, m.sums.ref)
	for d, v := range c.e.blankV {
		w := c.blank[d*n : (d+1)*n]
		axpy(v[l], w, m.sums.b1[d])
		addOuter(m.sums.b2, w, v[l])
	}
	for h := range n {
		for h2 := range h + 1 {
			kk := k[h] * k[h2]
			at := (h*n + h2) * n * n
			axpy(kk, c.cov, m.ref[at:at+n*n])
			for d, v := range c.e.blankV {
				w, vk := c.blank[d*n:(d+1)*n], v[l]*kk
				axpy(vk, w, m.b1[d][(h*n+h2)*n:(h*n+h2+1)*n])
				for g, x := range w {
					if x != 0 {
						axpy(vk*x, w, m.b2[at+g*n:at+(g+1)*n])
					}
				}
			}
		}
	}
}
