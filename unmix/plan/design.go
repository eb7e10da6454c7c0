package plan

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
	"tarnlight/unmix/merit"
)

// Design is a problem made ready: what each excitation adds to the matrices of a
// fit. Columns are in units of the typical levels, so that every uncertainty is
// relative to its level. A Design can be used by several goroutines.
type Design struct {
	p     Problem
	n     int    // components
	want  []bool // n
	lines []scan // J
	use   []int  // of lines: those with cells

	alike   []float64 // J × J: correlation of departures at two excitations
	alikeEm float64   // of neighbours along emission

	a     []float64 // cells × n, components at their typical levels
	cells []int     // of the grid, increasing
	from  []int     // J + 1: where the cells of each excitation begin in cells
}

// scan is what one excitation adds, n × n each.
type scan struct {
	cells int
	gram  []float64   // KᵀK
	noise []float64   // KᵀVK, V of the typical bottle; behind it the sum of the misfit and the number of cells
	light [][]float64 // the part of noise that is component g's light
}

// New makes a problem ready. It panics where lengths do not fit the set's grid.
func New(p Problem) (*Design, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	d := &Design{p: p, n: p.Set.Len(), want: p.Want}
	if d.want == nil {
		d.want = make([]bool, d.n)
		for f := range d.want {
			d.want[f] = true
		}
	}
	d.a, d.cells = p.Set.Matrix()
	for i := range d.a { // amounts in units of the typical level
		d.a[i] *= p.Level[i%d.n]
	}
	nj, nk := p.Set.Grid.Ex.Len(), p.Set.Grid.Em.Len()
	for j := range nj + 1 {
		at, _ := slices.BinarySearch(d.cells, j*nk)
		d.from = append(d.from, at)
	}
	d.lines = make([]scan, nj)
	all := make([]int, nj)
	for j := range all {
		all[j] = j
	}
	d.setAlike()
	d.sum(all)
	if len(d.use) == 0 {
		return nil, fmt.Errorf("%s: no cell that is scanned knows every one of the components", p.Set.Origin)
	}
	return d, nil
}

// sum makes the matrices of the given excitations.
func (d *Design) sum(lines []int) {
	for _, j := range lines {
		lo, hi := d.from[j], d.from[j+1]
		d.lines[j] = d.scanOf(d.a[lo*d.n:hi*d.n], d.cells[lo:hi])
		if d.lines[j].cells > 0 {
			d.use = append(d.use, j)
		}
	}
}

// through is the design seen through another window, for the given excitations alone.
func (d *Design) through(w Window, lines []int) *Design {
	out := *d
	out.p.Window, out.use = w, nil
	out.setAlike()
	out.lines = make([]scan, len(d.lines))
	out.sum(lines)
	return &out
}

// scanOf sums over the cells of one excitation; a is cells × n.
func (d *Design) scanOf(a []float64, cells []int) scan {
	n, nk := d.n, d.p.Set.Grid.Em.Len()
	var rows [][]float64
	var at []int
	for l, i := range cells {
		v := d.p.dark(i) + d.p.light(i)
		if d.p.Window.has(i%nk) && !math.IsNaN(v) && !math.IsInf(v, 0) {
			rows, at = append(rows, a[l*n:(l+1)*n]), append(at, i)
		}
	}
	s := scan{cells: len(at), gram: make([]float64, n*n), noise: make([]float64, n*n+2), light: make([][]float64, n)}
	for g := range s.light {
		s.light[g] = make([]float64, n*n)
	}
	s.noise[n*n+1] = float64(len(at))
	apart := d.withoutUnknown(rows, at)
	for l, i := range at {
		k := apart[l]
		s.noise[n*n] += d.p.misfit(i)
		addOuter(s.gram, k, 1)
		addOuter(s.noise[:n*n], k, d.p.dark(i))
		for g := range n {
			v := d.p.light(i) * math.Max(0, rows[l][g])
			addOuter(s.noise[:n*n], k, v)
			addOuter(s.light[g], k, v)
		}
	}
	return s
}

// addOuter adds w·kkᵀ to m.
func addOuter(m, k []float64, w float64) {
	for h, x := range k {
		floats.AddScaled(m[h*len(k):(h+1)*len(k)], w*x, k)
	}
}

// withoutUnknown returns the part of each component on one scan that is orthogonal
// to the bands of the unknown interferents there: with a free height at this
// excitation alone, that is all that a fit can use (Schur complement).
func (d *Design) withoutUnknown(rows [][]float64, at []int) [][]float64 {
	if len(d.p.Unknown) == 0 || len(rows) == 0 {
		return rows
	}
	g := d.p.Set.Grid
	var basis [][]float64
	for _, u := range d.p.Unknown {
		b := make([]float64, len(at))
		for l, i := range at {
			b[l] = u.at(g.Em.At(i % g.Em.Len()))
		}
		before := floats.Norm(b, 2)
		for range 2 { // twice is enough
			for _, q := range basis {
				floats.AddScaled(b, -floats.Dot(b, q), q)
			}
		}
		if norm := floats.Norm(b, 2); norm > 1e-8*before && norm > 0 {
			floats.Scale(1/norm, b)
			basis = append(basis, b)
		}
	}
	out := make([][]float64, len(rows))
	for l := range rows {
		out[l] = slices.Clone(rows[l])
	}
	for _, q := range basis {
		for f := range d.n {
			dot := 0.0
			for l := range out {
				dot += q[l] * out[l][f]
			}
			for l := range out {
				out[l][f] -= dot * q[l]
			}
		}
	}
	return out
}

// Grid returns the grid of the candidates.
func (d *Design) Grid() eem.Grid { return d.p.Set.Grid }

// Lines returns the excitations, by their index, at which anything can be measured.
func (d *Design) Lines() []int { return slices.Clone(d.use) }

// Prediction is what a choice of scans would give.
type Prediction struct {
	Lines []int // excitations, by their index, increasing
	// Cost is the criterion: root mean square (or largest) relative standard
	// uncertainty of the components asked for, at their typical levels; +Inf where
	// the scans do not tell all components apart.
	Cost      float64
	U         []float64 // standard uncertainty in a typical bottle, unit of the contribution; NaN undetermined
	Detection []float64 // detection limit in a typical bottle without the component
	VIF       []float64 // variance inflation by overlap, +Inf undetermined
	Cells     int
}

// Predict says what scans at these excitations would give.
func (d *Design) Predict(lines []int) Prediction {
	w := d.worker()
	w.set(lines)
	out := Prediction{Lines: sorted(lines), Cost: w.cost(), U: nans(d.n), Detection: nans(d.n), VIF: make([]float64, d.n)}
	for f := range out.VIF {
		out.VIF[f] = math.Inf(1)
	}
	for _, j := range lines {
		out.Cells += d.lines[j].cells
	}
	if !(out.Cost < singular) {
		out.Cost = math.Inf(1)
		return out
	}
	for f := range d.n {
		none := slices.Clone(w.noise[:d.n*d.n])
		for _, j := range lines {
			floats.Sub(none, d.lines[j].light[f])
		}
		out.U[f] = d.p.Level[f] * math.Sqrt(w.total(f))
		out.Detection[f] = merit.Currie(d.p.Level[f] * math.Sqrt(math.Max(0, w.variance(f, none)))).Detection
		out.VIF[f] = w.inverse[f*d.n+f] * w.gram[f*d.n+f]
	}
	return out
}

// All predicts what all scans together would give.
func (d *Design) All() Prediction { return d.Predict(d.use) }

func nans(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = math.NaN()
	}
	return v
}
