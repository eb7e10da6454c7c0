package merit

import (
	"math"
	"slices"
	"strconv"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
)

// worker judges one bottle after another.
type worker struct {
	e     *engine
	r     []float64 // J × K residual
	draws []float64 // Monte Carlo, used again by every bottle
}

func (e *engine) worker() *worker { return &worker{e: e, r: make([]float64, e.c.Cells())} }

// source is one cause of one bottle: at adds to dst (n × n) the covariance of
// K'(δb − Σ x δK) at amounts x.
type source struct {
	Term
	at func(dst, x []float64)
	// What at was made of, where it is linear in the amounts: independent effects
	// [h][g], or their products summed (see mask).
	effects [][]float64
	tensor  []float64
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

// bottle is one row on its way.
type bottle struct {
	*worker
	i       int
	m       *mask
	x       []float64
	sources []source
	own     []float64   // K'VK of the cells' own noise
	silent  []Term      // of causes whose size nobody stated
	nothing [][]float64 // by source, n × n: at amounts of 0
	repeats bool        // how the bottle repeats itself is taken from the standards
	out     Spread
}

// spread judges row i.
func (w *worker) spread(i int) Spread {
	b := w.bottle(i)
	if b.m != nil {
		b.gather()
		b.combine()
	}
	return b.out
}

// bottle begins row i; its m is nil where the bottle was not usable.
func (w *worker) bottle(i int) *bottle {
	n := w.e.n
	b := &bottle{worker: w, i: i, x: w.e.r.Value[i*n : (i+1)*n]}
	for _, v := range []*[]float64{&b.out.U, &b.out.DF, &b.out.Lower, &b.out.Upper, &b.out.Critical, &b.out.Detection, &b.out.Quantifiable, &b.out.Cov} {
		*v = nans(n)
	}
	b.out.NoiseRMS, b.out.ChiSquare = math.NaN(), math.NaN()
	if w.e.r.Fits[i].Usable {
		b.m = w.e.maskOf(i)
	}
	return b
}

// gather lists the sources.
func (b *bottle) gather() {
	b.noise()
	b.blanks()
	b.references()
	b.shared()
}

func nans(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = math.NaN()
	}
	return v
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

// noise adds the noise of the bottle's own cells and, where the residual is larger
// than noise can leave, what the model misses.
func (b *bottle) noise() {
	e, n := b.e, b.e.n
	u := e.c.SampleU(b.i)
	b.own = make([]float64, n*n)
	sse, sum, known := 0.0, 0.0, u != nil
	b.e.r.ResidualTo(b.r, e.c.Sample(b.i), b.i)
	b.residual(u)
	for _, l := range b.m.use {
		r := b.r[e.cells[l]]
		sse += r * r
		if !known {
			continue
		}
		v := float64(u[e.cells[l]])
		if v != v {
			known = false
			continue
		}
		sum += v * v
		addOuter(b.own, e.row(l), v*v)
	}
	df := float64(len(b.m.use) - positive(b.x))
	if df < 1 {
		return
	}
	s2 := sse / df
	if !known {
		clear(b.own)
		axpy(s2, b.m.gram, b.own)
		b.add("scatter of the residual", "cell", df, "the noise is not known; s²(K'K)⁻¹ of the bottle's own fit", fixed(b.own))
		return
	}
	b.add("noise", "cell", 0, "noise model of the blanks", fixed(b.own))
	mean := (sum + b.sharedNoise()) / float64(len(b.m.use))
	b.out.NoiseRMS, b.out.ChiSquare = math.Sqrt(mean), s2/mean
	if s2 > trusted*mean {
		tau, alike := b.inflation((s2 - mean) / s2)
		m := make([]float64, n*n)
		b.out.Misfit, b.out.Alike = s2-mean, alike
		axpy((s2-mean)*tau, b.m.gram, m)
		b.add(misfit, "bottle", 0, "residual beyond the noise; neighbours alike, so that "+strconv.FormatFloat(tau, 'f', 0, 64)+" cells count as one", fixed(m))
	}
}

// residual looks at the residual map, on the cells that took part.
func (b *bottle) residual(u []float32) {
	e, at := b.e, 0
	for c := range b.r {
		for at < len(b.m.use) && e.cells[b.m.use[at]] < c {
			at++
		}
		if at == len(b.m.use) || e.cells[b.m.use[at]] != c {
			b.r[c] = math.NaN()
		}
	}
	b.out.Hot = HottestSpot(e.c.Grid, b.r, u)
	b.out.Runs = RunsMap(b.r, e.c.Ex.Len(), e.c.Em.Len()).Z
}

// misfit is the name of what the model misses, a cause of its own.
const misfit = "misfit"

// trusted is by how much residual and noise variance may differ before it is called
// a misfit: the noise model itself is known to some 10 %.
const trusted = 1.25

func positive(x []float64) int {
	n := 0
	for _, v := range x {
		if v > 0 {
			n++
		}
	}
	return n
}

// sharedNoise sums over the cells what noise of standards and blanks adds to their
// variance.
func (b *bottle) sharedNoise() float64 {
	s, sum := &b.m.sums, 0.0
	n := b.e.n
	for g, x := range b.x {
		for h, y := range b.x {
			if s.ref != nil {
				sum += x * y * (s.ref[g*n+h] + s.b2[g*n+h])
			}
		}
	}
	if d := slices.Index(b.e.blanks, b.e.blankSet(b.i)); d >= 0 {
		a := b.e.factor(b.i)
		sum += a * a * s.b0[d]
		if s.b1 != nil {
			for g, x := range b.x {
				sum -= 2 * a * x * s.b1[d][g]
			}
		}
	}
	return sum
}

// inflation is how many cells of the residual count as one, from the correlation of
// neighbours along both axes (excitation, emission), of which the noise has none:
// (1+ρ)/(1−ρ) each, as of a first-order autoregression.
func (b *bottle) inflation(share float64) (tau float64, alike [2]float64) {
	nj, nk := b.e.c.Ex.Len(), b.e.c.Em.Len()
	var q, qx, nx, qm, nm, nq float64
	in := make([]bool, nj*nk)
	for _, l := range b.m.use {
		in[b.e.cells[l]] = true
	}
	for c, ok := range in {
		if !ok {
			continue
		}
		r := b.r[c]
		q, nq = q+r*r, nq+1
		if c%nk+1 < nk && in[c+1] {
			qm, nm = qm+r*b.r[c+1], nm+1
		}
		if c+nk < len(in) && in[c+nk] {
			qx, nx = qx+r*b.r[c+nk], nx+1
		}
	}
	tau = 1
	for axis, s := range [2][2]float64{{qx, nx}, {qm, nm}} {
		if s[1] > 0 && q > 0 {
			rho := min(max(s[0]/s[1]/(q/nq)/share, 0), 0.95)
			alike[axis] = rho
			tau *= (1 + rho) / (1 - rho)
		}
	}
	return min(tau, nq/float64(b.e.n+1)), alike
}

// blanks adds the noise of the subtracted mean of blanks, less what standards with
// the same blanks share of it, and what the blanks' scatter shows beyond noise.
func (b *bottle) blanks() {
	e, n := b.e, b.e.n
	key := e.blankSet(b.i)
	d := slices.Index(e.blanks, key)
	a := e.factor(b.i)
	if d >= 0 {
		b.add("blank", "batch", 0, "noise of the mean of blanks", func(dst, x []float64) {
			axpy(a*a, b.m.b0[d], dst)
			if b.m.b1 == nil {
				return
			}
			for h := range n {
				for h2 := range h + 1 {
					v := form(b.m.b2[(h*n+h2)*n*n:], x)
					for g, y := range x {
						v -= 2 * a * y * b.m.b1[d][(h*n+h2)*n+g]
					}
					both(dst, n, h, h2, v)
				}
			}
		})
	} else if b.m.b2 != nil && len(e.blanks) > 0 {
		b.addTensor("blank", "batch", 0, "noise of the standards' blanks", b.m.b2)
	}
	if once, df := b.m.blankScatter(e, key); once != nil {
		m := slices.Clone(once)
		axpy(a*a-1, once, m)
		b.add("blank, beyond noise", "batch", df, "scatter of the blanks as the components see it", fixed(m))
	}
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

// beyond is what blankScatter found of a set of blanks.
type beyond struct {
	cov []float64
	df  float64
}

// blankScatter returns the covariance of K'(blank) that the scatter of a bottle's
// own blanks shows beyond their noise, for one measurement and the mean subtracted
// together; nil where noise explains it (F test at 1 %). Bottles that miss the same
// cells and have the same blanks share it.
func (m *mask) blankScatter(e *engine, key string) ([]float64, float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	s, ok := m.beyond[key]
	if !ok {
		s.cov, s.df = m.scatterOf(e, key)
		if m.beyond == nil {
			m.beyond = map[string]beyond{}
		}
		m.beyond[key] = s
	}
	return s.cov, s.df
}

func (m *mask) scatterOf(e *engine, key string) ([]float64, float64) {
	n := e.n
	if key == "" || e.src.Blank == nil {
		return nil, 0
	}
	scatter, noise := make([]float64, n*n), make([]float64, n*n)
	count := 0.0
	q := make([]float64, n)
	for i, blank := range e.src.Blank {
		u := e.c.SampleU(i)
		if !blank || e.blankSet(i) != key || u == nil {
			continue
		}
		count++
		clear(q)
		x := e.c.Sample(i)
		for _, l := range m.use {
			v, s := x[e.cells[l]], float64(u[e.cells[l]])
			if v != v || s != s {
				continue
			}
			axpy(v, e.row(l), q)
			addOuter(noise, e.row(l), s*s)
		}
		addOuter(scatter, q, 1)
	}
	if count < 2 {
		return nil, 0
	}
	limit := distuv.ChiSquared{K: count - 1}.Quantile(0.99) / (count - 1)
	out, more := make([]float64, n*n), false
	w := inverse(m.gram, n, all(n))
	if w == nil {
		return nil, 0
	}
	for h := range n {
		row := w[h*n : (h+1)*n]
		have, want := form(scatter, row)/(count-1), form(noise, row)/count
		more = more || have > limit*want
	}
	if !more {
		return nil, 0
	}
	for i := range out {
		out[i] = (scatter[i]/(count-1) - noise[i]/count) * (1 + 1/count)
	}
	return out, count - 1
}

// references adds what is wrong with the components themselves.
func (b *bottle) references() {
	e, n := b.e, b.e.n
	if b.m.ref != nil {
		b.addTensor("noise of the standards", "standard", 0, "noise model of the blanks", b.m.ref)
	}
	b.scatter()
	if b.m.apart != nil {
		b.addTensor("absorbance noise of the standards", "standard", 0, "roughness of the absorbance spectrum", b.m.apart)
	}
	if b.m.load != nil {
		text := "uncertainty of the given spectra"
		if e.src.Loadings != nil {
			text = "infinitesimal jackknife over the bottles of the model"
		}
		b.addTensor("loadings", "survey", 0, text, b.m.load)
	}
	if b.m.floor != nil {
		b.addLinear(CauseFloor, "survey", 0, "mean of noise without its negative half, where a spectrum is zero", b.m.floor)
	}
	b.frozen()
	if e.src.StockMissing {
		b.silent = append(b.silent, Term{Cause: "standards", Scope: "survey", Source: "not given"})
	}
	if e.src.Stock > 0 {
		var effects [][]float64
		for g := range n {
			effect := make([]float64, n*n)
			for h := range n {
				effect[h*n+g] = b.m.gram[h*n+g] * e.src.Stock
			}
			effects = append(effects, effect)
		}
		b.addLinear("standards", "survey", 0, "settings: uncertainty", effects)
	}
}

var scopes = map[eem.Scope]string{eem.OfSurvey: "survey", eem.OfBatch: "batch", eem.OfStandard: "standard", eem.OfBottle: "bottle"}

// shared adds the causes that cells share. One that acts on bottle and standards
// acts on both together.
func (b *bottle) shared() {
	e, n := b.e, b.e.n
	group := map[string]int{}
	add := func(name, scope string, df float64, text string, effect []float64) {
		if _, ok := group[name]; !ok {
			group[name] = len(b.sources)
			b.add(name, scope, df, text, nil)
		}
		own := &b.sources[group[name]]
		own.effects = append(own.effects, effect)
		own.at = linear(own.effects, n)
	}
	done := map[int]bool{}
	for _, c := range e.causesOf(b.i) {
		if c.U != c.U && b.repeats && c.Name == CauseRepeat {
			continue
		}
		if c.U != c.U {
			b.silent = append(b.silent, Term{Cause: c.Name, Scope: scopes[c.Scope], Source: "not given"})
			continue
		}
		if c.Apart {
			done[e.placeOf(c)] = true
			b.add(c.Name, scopes[c.Scope], c.DF, c.Source, b.byWavelength(&c))
			continue
		}
		effect := b.onBottle(&c)
		if z, ok := e.place[idOf(c)]; ok {
			done[z] = true
			axpy(-1, b.m.q[z], effect)
		}
		add(c.Name, scopes[c.Scope], c.DF, c.Source, effect)
	}
	for z := range e.causes {
		c := &e.causes[z]
		if done[z] || c.apart {
			continue
		}
		effect := make([]float64, n*n)
		axpy(-1, b.m.q[z], effect)
		if c.scope == eem.OfBottle {
			add(c.name+ofStandards, "standard", c.df, c.source, effect)
		} else {
			add(c.name, scopes[c.scope], c.df, c.source, effect)
		}
	}
}

// byWavelength is the source of a cause that every wavelength has for itself.
func (b *bottle) byWavelength(c *eem.Cause) func(dst, x []float64) {
	n := b.e.n
	return func(dst, x []float64) {
		v := make([]float64, n)
		for _, mode := range []struct{ u, sums []float64 }{{c.Ex, b.m.kx}, {c.Em, b.m.km}} {
			for i, u := range mode.u {
				for h := range n {
					v[h] = 0
					for g, y := range x {
						v[h] += mode.sums[(i*n+h)*n+g] * y
					}
				}
				addOuter(dst, v, u*u)
			}
		}
	}
}

// onBottle returns [h][g]: Σ K_h·relative·K_g, the change of K'b with b = Σ x_g K_g.
// Of a contribution that is a height (Fmax) the survey's own errors only move that
// height: the loadings have them too.
func (b *bottle) onBottle(c *eem.Cause) []float64 {
	e, n := b.e, b.e.n
	out := make([]float64, n*n)
	if c.Scope == eem.OfSurvey && e.src.References == nil && e.r.Set.Components[0].AmountUnit == "" {
		for g := range n {
			comp := &e.r.Set.Components[g]
			v := relative(c, int32(peak(comp.Ex)), int32(peak(comp.Em)))
			for h := range n {
				out[h*n+g] = v * b.m.gram[h*n+g]
			}
		}
		return out
	}
	if c.Ex == nil && c.Em == nil {
		axpy(c.U, b.m.gram, out)
		return out
	}
	// Σ (U + ex_j + em_k) K_h K_g by what wavelengths sum up to.
	axpy(c.U, b.m.gram, out)
	for _, mode := range []struct{ shape, sums []float64 }{{c.Ex, b.m.kx}, {c.Em, b.m.km}} {
		for i, v := range mode.shape {
			if sum := mode.sums[i*n*n : (i+1)*n*n]; slices.Max(sum) > 0 { // a wavelength that no cell has need not be known
				axpy(v, sum, out)
			}
		}
	}
	return out
}

func peak(v []float64) int {
	at := 0
	for i, x := range v {
		if x > v[at] {
			at = i
		}
	}
	return at
}
