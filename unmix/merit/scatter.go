package merit

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/stat/distuv"

	"tarnlight/eem"
	"tarnlight/unmix"
)

// Scatter is by how much single standards of a component are off their own line,
// beyond what their budget explains.
type Scatter struct {
	U      float64 // relative standard deviation of one standard; 0: the budget explains all
	DF     float64 // degrees of freedom; 0: it cannot be seen
	Source string
}

// CauseScatter is the name of that cause, CauseRepeat what it is called of a bottle
// of which nobody knows how it repeats itself.
const (
	CauseScatter = "scatter of the standards"
	CauseRepeat  = "repeatability"
)

// residual is one standard's departure from the line of its component.
type residual struct {
	f     int
	off   float64 // found/given − 1
	v     float64 // variance of off by the budget
	lever float64 // variance of off were every standard off by a relative variance of 1
}

// Scatters looks how far the standards scatter about the lines through zero that
// were made of them, one Scatter a component. The budget of a standard says what
// variance v its relative residual should have; the excess u² is where
//
//	Σ residual²/(v + l·u²) = number of residuals,
//
// l being how a relative error of every standard acts on that residual, its own
// leverage included (Paule & Mandel 1982, J. Res. NBS 87, 377: excess variance, as
// the ratio of Birge 1932 without its change of all weights; residual standard
// deviation of the calibration line, ISO 8466-1; all from memory). A laboratory
// handles all its standards alike, so that one u is found for all components, with
// their degrees of freedom together; a component that scatters more than the others
// (F test at 1 %) has its own. Nil without standards.
func Scatters(c *eem.Cube, r *unmix.Resolution, src *Sources) []Scatter {
	refs := src.References
	if refs == nil || refs.Given == nil {
		return nil
	}
	bare := *src
	bare.Stock, bare.StockMissing, bare.Scatter = 0, false, nil
	e := newEngine(c, r, &bare)
	by := make([][]residual, e.n)
	w := e.worker()
	for s := range refs.Row {
		for _, p := range w.residuals(s) {
			by[p.f] = append(by[p.f], p)
		}
	}
	return pooled(by)
}

// residuals judges the doses of standard s; those that say nothing about a line are
// left out.
func (w *worker) residuals(s int) []residual {
	e := w.e
	b := w.bottle(e.src.References.Row[s])
	if b.m == nil {
		return nil
	}
	b.gather()
	total := make([]float64, e.n*e.n)
	for _, s := range b.sources {
		s.at(total, b.x)
	}
	wp := inverse(b.m.gram, e.n, passiveSet(b.x, -1))
	var out []residual
	for _, d := range e.doses {
		if d.s != s {
			continue
		}
		by := b.sensitivity(d.f, wp)
		if by == nil {
			continue
		}
		p := residual{f: d.f, off: b.x[d.f]/d.given - 1, v: form(total, by) / d.given / d.given, lever: b.lever(d, by)}
		if p.v > 0 && p.lever > 1e-6 { // a component's only standard lies on its own line
			out = append(out, p)
		}
	}
	return out
}

// lever is the sum over all doses of the squared change of the residual of d when
// that dose is off by one: through the references, and by itself in its own standard.
func (b *bottle) lever(d dose, by []float64) float64 {
	n, sum := b.e.n, 0.0
	for z, other := range b.e.doses {
		v := 0.0
		for h, l := range by {
			if other.s == d.s {
				v += l * b.m.gram[h*n+other.f] * other.given
			}
			for g, x := range b.x {
				v -= l * b.m.dose[z][h*n+g] * x
			}
		}
		sum += v * v
	}
	return sum / d.given / d.given
}

// pooled finds one excess for all components but those that scatter more.
func pooled(by [][]residual) []Scatter {
	out := make([]Scatter, len(by))
	in := make([]bool, len(by))
	for f := range by {
		in[f] = len(by[f]) > 1
	}
	for {
		worst := unlike(by, in)
		if worst < 0 {
			break
		}
		in[worst] = false
		out[worst] = scatterOf(by[worst], float64(len(by[worst])-1), "its standards scatter")
	}
	together, df := gather(by, in, -1)
	s := scatterOf(together, df, "standards scatter")
	for f := range out {
		if out[f].DF == 0 {
			out[f] = s
		}
	}
	return out
}

// gather lists the residuals of the components in the pool but one, with their
// degrees of freedom.
func gather(by [][]residual, in []bool, but int) (out []residual, df float64) {
	for f, ok := range in {
		if ok && f != but {
			out = append(out, by[f]...)
			df += float64(len(by[f]) - 1)
		}
	}
	return out, df
}

// unlike is the component of the pool whose standards scatter most beyond those of
// all others, −1 where chance explains it.
func unlike(by [][]residual, in []bool) int {
	worst, most := -1, 1.0
	for f, ok := range in {
		others, df := gather(by, in, f)
		if !ok || df < 1 {
			continue
		}
		n := float64(len(by[f]))
		limit := distuv.F{D1: n - 1, D2: df}.Quantile(0.99)
		if ratio := birge(by[f], excess(others)) / n / limit; ratio > most {
			worst, most = f, ratio
		}
	}
	return worst
}

func scatterOf(ps []residual, df float64, who string) Scatter {
	if df < 1 {
		return Scatter{Source: "not given: one standard a component does not show it"}
	}
	s := Scatter{U: math.Sqrt(excess(ps)), DF: df}
	var have, want float64
	for _, p := range ps {
		have, want = have+p.off*p.off, want+p.v
	}
	n := float64(len(ps))
	s.Source = fmt.Sprintf("%s by %s %% about the line through zero, their budget explains %s %% (excess variance, %d standards)",
		who, digits(100*math.Sqrt(have/n), 2), digits(100*math.Sqrt(want/n), 2), len(ps))
	return s
}

// excess is u², 0 where the budget explains the residuals.
func excess(ps []residual) float64 {
	n := float64(len(ps))
	if birge(ps, 0) <= n {
		return 0
	}
	lo, hi := 0.0, 0.0
	for _, p := range ps {
		hi = math.Max(hi, n*p.off*p.off/p.lever)
	}
	for range 100 {
		if mid := (lo + hi) / 2; birge(ps, mid) > n {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}

// birge is Σ residual²/variance with the excess u².
func birge(ps []residual, u2 float64) float64 {
	s := 0.0
	for _, p := range ps {
		s += p.off * p.off / (p.v + p.lever*u2)
	}
	return s
}

// dose is an amount given to a standard.
type dose struct {
	s, f  int
	given float64
}

// listDoses finds them, and the different sizes of their scatter.
func (e *engine) listDoses() {
	for _, s := range e.src.Scatter {
		if s.U > 0 && !slices.Contains(e.groups, s) {
			e.groups = append(e.groups, s)
		}
	}
	if e.src.References == nil {
		return
	}
	for s, given := range e.src.References.Given {
		for f, v := range given {
			if v > 0 {
				e.doses = append(e.doses, dose{s, f, v})
			}
		}
	}
}

// scatterGroup is the place of the Scatter of component f among the different ones
// that have a size, −1 where it has none.
func (e *engine) scatterGroup(f int) int {
	if f >= len(e.src.Scatter) { // a component that was added to the model
		return -1
	}
	return slices.Index(e.groups, e.src.Scatter[f])
}

// doses adds what a relative error of each dose does to the components in cell l:
// δK_g = Σ_s W_gs c_sf K_f.
func (c *standardCell) doses(m *mask, l int32) {
	n := c.e.n
	k := c.e.row(l)
	for z, d := range c.e.doses {
		for g := range n {
			w := c.w[d.s*n+g] * d.given * k[d.f]
			if w == 0 {
				continue
			}
			for h, x := range k {
				m.dose[z][h*n+g] += x * w
			}
		}
	}
}

// scatterTo sums the products of the doses' errors.
func (m *mask) scatterTo(e *engine) {
	y := make([]float64, e.n*e.n)
	m.scatter = make([][]float64, len(e.groups))
	for t := range m.scatter {
		m.scatter[t] = make([]float64, e.n*e.n*e.n*e.n)
	}
	for z, d := range e.doses {
		t := e.scatterGroup(d.f)
		if t < 0 {
			continue
		}
		for i, v := range m.dose[z] {
			y[i] = e.groups[t].U * v
		}
		addTensor(m.scatter[t], y, e.n)
	}
}

// scatter adds the standards' own scatter: what it does to the components and, of a
// bottle of which nobody knows how it repeats itself, once more for the bottle, since
// what makes standards scatter can then be the measuring as well as their making (the
// term 1/N of ISO 8466-1).
func (b *bottle) scatter() {
	for _, s := range b.e.src.Scatter {
		if s.DF == 0 {
			b.silent = append(b.silent, Term{Cause: CauseScatter, Scope: "standard", Source: s.Source})
		}
	}
	b.repeats = len(b.e.groups) > 0 && slices.ContainsFunc(b.e.causesOf(b.i), unknownRepeat)
	for t, s := range b.e.groups {
		b.addTensor(CauseScatter, "standard", s.DF, s.Source, b.m.scatter[t])
		if b.repeats {
			b.add(CauseRepeat, "bottle", s.DF, "no blanks or duplicates tell it; "+s.Source, b.repeatLike(t))
		}
	}
}

func unknownRepeat(c eem.Cause) bool { return c.Name == CauseRepeat && c.U != c.U }

// repeatLike is the source of a bottle whose amounts scatter like the standards of
// group t.
func (b *bottle) repeatLike(t int) func(dst, x []float64) {
	n := b.e.n
	return func(dst, x []float64) {
		col := make([]float64, n)
		for g, y := range x {
			if b.e.scatterGroup(g) != t {
				continue
			}
			for h := range n {
				col[h] = b.m.gram[h*n+g]
			}
			addOuter(dst, col, b.e.groups[t].U*b.e.groups[t].U*y*y)
		}
	}
}
