package merit

import (
	"math"
	"sync"

	"tarnlight/eem"
)

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
	bent  []float64   // effect of the bounds at zero; nil: none
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
		m.bounds(e)
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
