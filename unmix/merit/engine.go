package merit

import (
	"runtime"
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

func axpy(a float64, x, y []float64) {
	for i, v := range x {
		y[i] += a * v
	}
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
