package merit

import (
	"math"
	"runtime"
	"slices"
	"sync"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// engine holds what the bottles of a resolution share.
//
// With K the components on the cells of a bottle and b its cells, the contributions
// are x = Lb, L = (K'K)⁻¹K' over those above zero, and to first order
//
//	δx = (K'K)⁻¹ K'(δb − Σ_g x_g δK_g)
//
// so that every source of error is a matrix M, the covariance of K'(δb − Σ x δK),
// and its part of the covariance of x is W M W', W = (K'K)⁻¹. Shared causes have
// rank one: M = ee'. What M needs of the cells depends on which are missing, and is
// kept for bottles that miss the same ones.
type engine struct {
	c     *eem.Cube
	r     *unmix.Resolution
	src   *Sources
	n     int
	cells []int
	ja    []int32 // excitation and
	ka    []int32 // emission of each of cells
	a     []float64

	causes []shared    // of the standards
	place  map[id]int  // in causes
	doses  []dose      // of the standards
	groups []Scatter   // the different sizes of their scatter
	blanks []string    // blank sets that act, in order of appearance
	blankV [][]float64 // variance on cells, one a blank set
	draws  []float64   // standard normal, for Monte Carlo
	pairs  []Alike

	mu    sync.Mutex
	masks map[string]*mask
}

// id is what makes two causes one unknown.
type id struct {
	name  string
	scope eem.Scope
	key   string
}

func idOf(c eem.Cause) id { return id{c.Name, c.Scope, c.Key} }

// shared is one unknown behind standards, with how it acts on each of them.
type shared struct {
	id
	df     float64
	source string
	apart  bool
	on     []part
}

// part is the relative action of a cause on standard s.
type part struct {
	s     int
	cause eem.Cause
}

// relative is the change of a cell at (j, k), relative; Shape is none of it.
func relative(c *eem.Cause, j, k int32) float64 {
	v := c.U
	if c.Ex != nil {
		v += c.Ex[j]
	}
	if c.Em != nil {
		v += c.Em[k]
	}
	return v
}

// Spreads judges how sure the contributions of a resolution of c are, one Spread a
// row. It panics when src does not have the length of the cube. Rows do not depend
// on one another but for the standards and blanks that they share.
func Spreads(c *eem.Cube, r *unmix.Resolution, src *Sources) []Spread {
	return spreadsOf(c, r, src, all(c.Len()))
}

// spreadsOf is Spreads of some rows; the others stay zero.
func spreadsOf(c *eem.Cube, r *unmix.Resolution, src *Sources, rows []int) []Spread {
	e := newEngine(c, r, src)
	out := make([]Spread, c.Len())
	var wg sync.WaitGroup
	next := make(chan int)
	for range min(runtime.GOMAXPROCS(0), max(1, len(rows))) {
		wg.Go(func() {
			w := e.worker()
			for i := range next {
				out[i] = w.spread(i)
			}
		})
	}
	for _, i := range rows {
		next <- i
	}
	close(next)
	wg.Wait()
	return out
}

func newEngine(c *eem.Cube, r *unmix.Resolution, src *Sources) *engine {
	if src == nil {
		src = &Sources{}
	}
	for _, n := range []int{len(src.Causes), len(src.BlankSet), len(src.Factor), len(src.Blank)} {
		if n != 0 && n != c.Len() {
			panic("merit: the sources are not those of the cube")
		}
	}
	e := &engine{c: c, r: r, src: src, n: r.Set.Len(), place: map[id]int{}, masks: map[string]*mask{}}
	e.a, e.cells = r.Set.Matrix()
	nk := c.Em.Len()
	for _, cell := range e.cells {
		e.ja, e.ka = append(e.ja, int32(cell/nk)), append(e.ka, int32(cell%nk))
	}
	if src.References != nil {
		for s, row := range src.References.Row {
			for _, cause := range e.causesOf(row) {
				if cause.U != cause.U {
					continue
				}
				z, ok := e.place[idOf(cause)]
				if !ok {
					z = len(e.causes)
					e.place[idOf(cause)] = z
					e.causes = append(e.causes, shared{id: idOf(cause), df: cause.DF, source: cause.Source, apart: cause.Apart})
				}
				e.causes[z].on = append(e.causes[z].on, part{s, cause})
			}
		}
	}
	e.listBlanks()
	e.listDoses()
	e.pairs = Pairs(r.Set)
	e.draws = normals(src.Seed, drawn*e.n)
	return e
}

func (e *engine) causesOf(row int) []eem.Cause {
	if e.src.Causes == nil || row == nobody {
		return nil
	}
	return e.src.Causes[row]
}

// placeOf is where the standards have a cause, −1 where they do not.
func (e *engine) placeOf(c eem.Cause) int {
	if z, ok := e.place[idOf(c)]; ok {
		return z
	}
	return -1
}

func (e *engine) blankSet(row int) string {
	if e.src.BlankSet == nil || row == nobody {
		return ""
	}
	return e.src.BlankSet[row]
}

func (e *engine) factor(row int) float64 {
	if e.src.Factor == nil || row == nobody {
		return 1
	}
	return e.src.Factor[row]
}

// listBlanks finds the blank sets whose noise is known.
func (e *engine) listBlanks() {
	seen := map[string]bool{}
	for i := range e.c.Len() {
		key := e.blankSet(i)
		u := e.src.BlankU[key]
		if key == "" || seen[key] || u == nil {
			continue
		}
		seen[key] = true
		v := make([]float64, len(e.cells))
		for l, cell := range e.cells {
			if x := float64(u[cell]); x == x {
				v[l] = x * x
			}
		}
		e.blanks, e.blankV = append(e.blanks, key), append(e.blankV, v)
	}
}

// mask is what bottles that miss the same cells share. Matrices are n × n in the
// order [h][g] unless said otherwise; sums run over the cells present.
type mask struct {
	once  sync.Once
	use   []int32   // of engine.cells
	gram  []float64 // K'K
	q     [][]float64
	dose  [][]float64 // by dose: what a relative error of it does to K'K
	ref   []float64   // [h][h'][g][g']: noise of the references
	load  []float64   // the same: loadings
	floor [][]float64 // effects: loadings cut at zero
	apart []float64   // as ref: errors of the standards that each wavelength has for itself
	// scatter, by group, is the same: the standards' own scatter.
	scatter [][]float64
	kx      []float64   // [j][h][g]: Σ K_h K_g over the cells of one excitation
	km      []float64   // [k][h][g]: of one emission
	b0      [][]float64 // by blank set: K'VK
	b1      [][]float64 // by blank set: [h][h'][g]
	b2      []float64   // [h][h'][g][g'], all sets
	sums    sums

	mu     sync.Mutex
	beyond map[string]beyond // by blank set
}

// sums are the same variances summed over the cells, for what noise should leave of
// a residual.
type sums struct {
	ref []float64   // [g][g']
	b0  []float64   // by blank set
	b1  [][]float64 // by blank set: [g]
	b2  []float64   // [g][g']
}

// maskOf returns the shared part of row i, made when it is first asked for.
func (e *engine) maskOf(i int) *mask {
	why, x := e.c.SampleWhy(i), e.c.Sample(i)
	bits := make([]byte, (len(e.cells)+7)/8)
	for l, cell := range e.cells {
		if why[cell] == eem.Measured && !math.IsNaN(x[cell]) {
			bits[l/8] |= 1 << (l % 8)
		}
	}
	e.mu.Lock()
	m := e.masks[string(bits)]
	if m == nil {
		m = &mask{}
		e.masks[string(bits)] = m
	}
	e.mu.Unlock()
	m.once.Do(func() {
		for l := range e.cells {
			if bits[l/8]&(1<<(l%8)) != 0 {
				m.use = append(m.use, int32(l))
			}
		}
		m.make(e)
	})
	return m
}

func (m *mask) make(e *engine) {
	n := e.n
	m.gram = make([]float64, n*n)
	for _, l := range m.use {
		addOuter(m.gram, e.row(l), 1)
	}
	m.wavelengths(e)
	m.blankOwn(e)
	if e.src.References != nil {
		m.standards(e)
	}
	if e.src.Loadings != nil || e.hasLoadingU() {
		m.load = make([]float64, n*n*n*n)
	}
	if e.src.Loadings != nil {
		m.moves(e)
		m.floors(e)
	}
	if e.hasLoadingU() {
		m.loadingU(e)
	}
}

// wavelengths sums K_h K_g by excitation and by emission.
func (m *mask) wavelengths(e *engine) {
	nn := e.n * e.n
	m.kx, m.km = make([]float64, e.c.Ex.Len()*nn), make([]float64, e.c.Em.Len()*nn)
	for _, l := range m.use {
		j, k := int(e.ja[l])*nn, int(e.ka[l])*nn
		addOuter(m.kx[j:j+nn], e.row(l), 1)
		addOuter(m.km[k:k+nn], e.row(l), 1)
	}
}

// row is the components in cell l.
func (e *engine) row(l int32) []float64 { return e.a[int(l)*e.n : (int(l)+1)*e.n] }

// addOuter adds w·kk' to m.
func addOuter(m, k []float64, w float64) {
	for h, x := range k {
		x *= w
		o := m[h*len(k) : (h+1)*len(k)]
		for g, y := range k {
			o[g] += x * y
		}
	}
}

func (m *mask) blankOwn(e *engine) {
	for _, v := range e.blankV {
		b, sum := make([]float64, e.n*e.n), 0.0
		for _, l := range m.use {
			addOuter(b, e.row(l), v[l])
			sum += v[l]
		}
		m.b0, m.sums.b0 = append(m.b0, b), append(m.sums.b0, sum)
	}
}

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

func axpy(a float64, x, y []float64) {
	for i, v := range x {
		y[i] += a * v
	}
}

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

// addTensor adds y[h][g]·y[h'][g'] to t, h' ≤ h.
func addTensor(t, y []float64, n int) {
	for h := range n {
		for h2 := range h + 1 {
			at := (h*n + h2) * n * n
			for g := range n {
				if v := y[h*n+g]; v != 0 {
					axpy(v, y[h2*n:(h2+1)*n], t[at+g*n:at+(g+1)*n])
				}
			}
		}
	}
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
