package merit

import (
	"math"
	"slices"
	"strconv"
)

// worker judges one bottle after another.
type worker struct {
	e     *engine
	r     []float64 // J × K residual
	draws []float64 // Monte Carlo, used again by every bottle
}

func (e *engine) worker() *worker { return &worker{e: e, r: make([]float64, e.c.Cells())} }

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
	b.out.Hot, b.out.Tops = HottestSpot(e.c.Grid, b.r, u), topsOf(e.c.Grid, b.r, u)
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
