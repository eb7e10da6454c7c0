package plan

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
)

// singular is the least cost of scans that do not tell all components apart; more
// for every component more that they do not.
const singular = 1e150

// least is the smallest pivot of the unit-norm Gram matrix that counts: 1e-10 is a
// variance inflation of 1e10.
const least = 1e-10

// worker judges one choice after another. Its matrices are small and change with
// every choice, so that the factorisation is written out; the library's allocates.
type worker struct {
	d           *Design
	gram, noise []float64 // sums over the choice
	norm        []float64 // lengths of the columns
	l, inverse  []float64
	together    float64 // see Design.together
}

func (d *Design) worker() *worker {
	nn := d.n * d.n
	return &worker{d: d, gram: make([]float64, nn), noise: make([]float64, nn+2), norm: make([]float64, d.n), l: make([]float64, nn), inverse: make([]float64, nn)}
}

// set makes the sums those of lines.
func (w *worker) set(lines []int) {
	clear(w.gram)
	clear(w.noise)
	for _, j := range lines {
		w.add(j)
	}
	w.together = w.d.together(lines, -1, w.noise[len(w.noise)-1])
}

func (w *worker) add(j int) {
	if s := &w.d.lines[j]; s.cells > 0 {
		floats.Add(w.gram, s.gram)
		floats.Add(w.noise, s.noise)
	}
}

// with returns the cost of lines, whose sums are given, and one line more.
func (w *worker) with(lines []int, gram, noise []float64, j int) float64 {
	s := &w.d.lines[j]
	floats.AddTo(w.gram, gram, s.gram)
	floats.AddTo(w.noise, noise, s.noise)
	w.together = w.d.together(lines, j, w.noise[len(w.noise)-1])
	return w.cost()
}

// cost returns the criterion for the sums as they are, and leaves their inverse.
func (w *worker) cost() float64 {
	if lost := w.factor(); lost > 0 {
		return singular * float64(lost)
	}
	w.invert()
	sum, worst, count := 0.0, 0.0, 0.0
	for f, want := range w.d.want {
		if want {
			v := w.total(f)
			sum, worst, count = sum+v, math.Max(worst, v), count+1
		}
	}
	if w.d.p.WorstCase {
		return math.Sqrt(worst)
	}
	return math.Sqrt(sum / count)
}

// factor writes the Cholesky factor of the unit-norm Gram matrix and returns how
// many of its columns depend on those before them.
func (w *worker) factor() (lost int) {
	n := w.d.n
	for f := range n {
		w.norm[f] = math.Sqrt(w.gram[f*n+f])
	}
	for j := range n {
		row := w.l[j*n : (j+1)*n]
		p := 1.0
		if !(w.norm[j] > 0) {
			p = 0
		}
		for i := range j {
			s := 0.0
			if p > 0 && w.norm[i] > 0 {
				s = w.gram[j*n+i] / (w.norm[j] * w.norm[i])
			}
			other := w.l[i*n : (i+1)*n]
			for k := range i {
				s -= row[k] * other[k]
			}
			row[i] = 0
			if other[i] > 0 {
				row[i] = s / other[i]
			}
			p -= row[i] * row[i]
		}
		if p < least {
			lost, row[j] = lost+1, 0
			continue
		}
		row[j] = math.Sqrt(p)
	}
	return lost
}

// invert writes (KᵀK)⁻¹ from the factor.
func (w *worker) invert() {
	n := w.d.n
	for c := range n { // columns of L⁻¹ into the lower part of inverse
		for r := c; r < n; r++ {
			s := 0.0
			if r == c {
				s = 1
			}
			for k := c; k < r; k++ {
				s -= w.l[r*n+k] * w.inverse[k*n+c]
			}
			w.inverse[r*n+c] = s / w.l[r*n+r]
		}
	}
	for f := range n { // L⁻ᵀL⁻¹, from the top: entry (f, h), h ≤ f, needs rows f and below alone
		for h := range f + 1 {
			s := 0.0
			for k := f; k < n; k++ {
				s += w.inverse[k*n+f] * w.inverse[k*n+h]
			}
			w.inverse[f*n+h] = s
		}
	}
	for f := range n {
		for h := range f + 1 {
			v := w.inverse[f*n+h] / (w.norm[f] * w.norm[h])
			w.inverse[f*n+h], w.inverse[h*n+f] = v, v
		}
	}
}

// total is the variance of component f.
func (w *worker) total(f int) float64 {
	nn := w.d.n * w.d.n
	return w.variance(f, w.noise) + w.together*w.noise[nn]/w.noise[nn+1]*w.inverse[f*w.d.n+f]
}

// variance is entry (f, f) of (KᵀK)⁻¹ m (KᵀK)⁻¹.
func (w *worker) variance(f int, m []float64) float64 {
	n := w.d.n
	row := w.inverse[f*n : (f+1)*n]
	sum := 0.0
	for h, x := range row {
		s := 0.0
		for g, y := range row {
			s += m[h*n+g] * y
		}
		sum += x * s
	}
	return sum
}

func sorted(lines []int) []int {
	out := slices.Clone(lines)
	slices.Sort(out)
	return out
}
