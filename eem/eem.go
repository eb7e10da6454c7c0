package eem

import (
	"fmt"
	"math"
	"slices"
)

// Unit is the unit of an intensity.
type Unit string

// The units of intensity that the module knows.
const (
	Counts  Unit = "counts" // whatever the detector reports
	Raman   Unit = "RU"     // Raman units, nm⁻¹: intensity over the area of water's Raman line at ex 350 nm
	Quinine Unit = "QSU"    // quinine sulfate units: 1 µg/L quinine sulfate dihydrate at ex 350 / em 450 nm
)

// Reason says why a cell is missing, or that its number was not measured. The
// values are written to survey.nc and stay as they are.
type Reason uint8

// Reasons of a cell.
const (
	Measured        Reason = iota // a measured number
	NotMeasured                   // never scanned, or blank in the file
	Saturated                     // at or above the detector's limit
	Uncorrected                   // outside the range of a spectral correction factor
	NoAbsorbance                  // outside the range of the absorbance spectrum
	OverAbsorbing                 // total absorbance above the limit of the inner-filter correction
	BelowExcitation               // emission shorter than the excitation: nothing can fluoresce there
	Rayleigh1                     // in the band of first-order Rayleigh scatter
	Rayleigh2                     // in the band of second-order Rayleigh scatter
	Raman1                        // in the band of first-order Raman scatter
	Raman2                        // in the band of second-order Raman scatter
	NoBlank                       // the blank has no number here
	Spike                         // a spike of the detector
	NumReasons                    // how many there are
)

var reasonNames = [NumReasons]string{
	"measured", "not measured", "saturated", "outside spectral factors", "outside absorbance",
	"over-absorbing", "below excitation", "Rayleigh first order", "Rayleigh second order",
	"Raman first order", "Raman second order", "no blank", "spike",
}

// String names the reason in words.
func (r Reason) String() string {
	if r < NumReasons {
		return reasonNames[r]
	}
	return fmt.Sprintf("reason %d", r)
}

// Scatter says whether the reason is a scatter band.
func (r Reason) Scatter() bool { return r >= BelowExcitation && r <= Raman2 }

// EEM is one excitation-emission matrix with its history. The constructors and
// operations keep the lengths of its slices true to the Grid.
type EEM struct {
	Grid
	Unit Unit
	F    []float64 // intensity, J × K row-major (one row an excitation), NaN missing
	Why  []Reason  // J × K; where F is a number and Why is not Measured, the cell was filled, not measured

	// Var is the variance, Unit², of each cell from causes that act on that
	// cell alone (read noise, shot noise); nil while nobody knows it. Causes
	// that cells share are listed apart: merged into one number a cell they
	// gave 60 % coverage where 95 % was meant.
	Var    []float64
	Causes []Cause
	Notes  []Note // in the order of the steps
}

// New returns an EEM with every cell missing (NotMeasured).
func New(g Grid, u Unit) *EEM {
	e := &EEM{Grid: g, Unit: u, F: make([]float64, g.Cells()), Why: make([]Reason, g.Cells())}
	for i := range e.F {
		e.F[i] = math.NaN()
		e.Why[i] = NotMeasured
	}
	return e
}

// FromCells returns an EEM that holds a copy of f, J × K row-major; NaN cells are
// NotMeasured, infinite ones too. It panics when len(f) is not J·K.
func FromCells(g Grid, u Unit, f []float64) *EEM {
	if len(f) != g.Cells() {
		panic(fmt.Sprintf("eem: %d cells for a grid of %d", len(f), g.Cells()))
	}
	e := New(g, u)
	for i, v := range f {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			e.F[i], e.Why[i] = v, Measured
		}
	}
	return e
}

// Clone returns a deep copy.
func (e *EEM) Clone() *EEM {
	c := *e
	c.F, c.Why, c.Var = slices.Clone(e.F), slices.Clone(e.Why), slices.Clone(e.Var)
	c.Causes, c.Notes = slices.Clone(e.Causes), slices.Clone(e.Notes)
	return &c
}

// At returns the intensity of cell (j, k).
func (e *EEM) At(j, k int) float64 { return e.F[e.Index(j, k)] }

// Row returns the emission scan of excitation j, K values; it is part of e.
func (e *EEM) Row(j int) []float64 { n := e.Em.Len(); return e.F[j*n : (j+1)*n : (j+1)*n] }

// Drop makes cell i missing for the given reason.
func (e *EEM) Drop(i int, r Reason) {
	e.F[i], e.Why[i] = math.NaN(), r
	if e.Var != nil {
		e.Var[i] = math.NaN()
	}
}

// Note appends a note.
func (e *EEM) Note(n Note) { e.Notes = append(e.Notes, n) }

// Present counts the cells that hold a measured number.
func (e *EEM) Present() int {
	n := 0
	for i, v := range e.F {
		if e.Why[i] == Measured && !math.IsNaN(v) {
			n++
		}
	}
	return n
}

// Interp returns the intensity at (ex, em), nm, interpolated linearly along both
// axes; NaN outside the grid and beside missing cells it would need.
func (e *EEM) Interp(ex, em float64) float64 {
	j, w, ok := e.Ex.Bracket(ex)
	if !ok {
		return math.NaN()
	}
	lo := e.Em.Interp(e.Row(j), em)
	if w == 0 {
		return lo
	}
	return lo + w*(e.Em.Interp(e.Row(j+1), em)-lo)
}

// Regrid returns e on grid g: interpolated linearly inside the measured range,
// missing outside it (NotMeasured), beside missing cells (their reason), and where a
// scan or a stretch of e itself is missing (NotMeasured): between two wavelengths
// that lie further apart than half again the usual step of e. On the points of e
// itself the numbers are those of e, bit for bit.
func (e *EEM) Regrid(g Grid) *EEM {
	if e.Grid.Equal(g) {
		c := e.Clone()
		c.Grid = g
		return c
	}
	out := New(g, e.Unit)
	out.Causes, out.Notes = slices.Clone(e.Causes), slices.Clone(e.Notes)
	if e.Var != nil {
		out.Var = make([]float64, g.Cells())
	}
	gapEx, gapEm := e.Ex.gaps(g.Ex), e.Em.gaps(g.Em)
	for j := range g.Ex.Len() {
		for k := range g.Em.Len() {
			i := g.Index(j, k)
			v, variance, why := math.NaN(), math.NaN(), NotMeasured
			if !gapEx[j] && !gapEm[k] {
				v, variance, why = e.sample(g.Ex.At(j), g.Em.At(k))
			}
			out.F[i], out.Why[i] = v, why
			if out.Var != nil {
				out.Var[i] = variance
			}
		}
	}
	return out
}

// sample interpolates value and variance at (ex, em) and says why there is none.
// The corners' errors are independent, so that the variance is Σ w²·var.
func (e *EEM) sample(ex, em float64) (v, variance float64, why Reason) {
	j, wj, ok1 := e.Ex.Bracket(ex)
	k, wk, ok2 := e.Em.Bracket(em)
	if !ok1 || !ok2 {
		return math.NaN(), math.NaN(), NotMeasured
	}
	corners := [4]struct {
		j, k int
		w    float64
	}{{j, k, (1 - wj) * (1 - wk)}, {j, k + 1, (1 - wj) * wk}, {j + 1, k, wj * (1 - wk)}, {j + 1, k + 1, wj * wk}}
	for _, c := range corners {
		if c.w == 0 {
			continue
		}
		i := e.Index(c.j, c.k)
		v += c.w * e.F[i]
		why = max(why, e.Why[i])
		if e.Var != nil {
			variance += c.w * c.w * e.Var[i]
		}
	}
	return v, variance, why
}

// Absorbance is a decadic absorbance spectrum measured through PathCM
// centimetres of liquid.
type Absorbance struct {
	Axis   Axis      // nm
	A      []float64 // dimensionless, same length as Axis, NaN missing
	PathCM float64   // cm, > 0
}

// PerCM returns the absorbance of 1 cm at nm, interpolated linearly, NaN outside
// the measured range: an absorbance is never extrapolated.
func (a *Absorbance) PerCM(nm float64) float64 { return a.Axis.Interp(a.A, nm) / a.PathCM }

// Times returns the spectrum of the same liquid f times as concentrated.
func (a *Absorbance) Times(f float64) *Absorbance {
	b := &Absorbance{Axis: a.Axis, A: slices.Clone(a.A), PathCM: a.PathCM}
	for i := range b.A {
		b.A[i] *= f
	}
	return b
}
