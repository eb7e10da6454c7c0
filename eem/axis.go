package eem

import (
	"encoding/binary"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"slices"
	"sort"
)

// sameNM is how far apart two wavelengths, nm, may lie and still be the same
// point of a grid. Instruments print 0.01 nm at best; 1e-4 absorbs the rounding
// of an axis that was written with four decimals and read back.
const sameNM = 1e-4

// Axis is a strictly increasing list of wavelengths, nm. The zero Axis is
// empty; every other Axis comes from NewAxis or Steps and can be trusted.
type Axis struct {
	nm []float64
}

// NewAxis copies nm. It rejects an empty list, values that are not finite or
// not positive, and lists that do not increase strictly.
func NewAxis(nm []float64) (Axis, error) {
	if len(nm) == 0 {
		return Axis{}, errors.New("a wavelength axis needs at least one value")
	}
	for i, v := range nm {
		if math.IsNaN(v) || math.IsInf(v, 0) || v <= 0 {
			return Axis{}, fmt.Errorf("wavelength %g nm at position %d; wavelengths must be positive", v, i+1)
		}
		if i > 0 && v <= nm[i-1] {
			return Axis{}, fmt.Errorf("wavelength %g nm follows %g nm; wavelengths must increase", v, nm[i-1])
		}
	}
	return Axis{nm: slices.Clone(nm)}, nil
}

// Steps returns the axis from, from+step, …, to (nm, both ends included when
// they fit). It rejects a step that is not positive and more than 100,000
// points.
func Steps(from, to, step float64) (Axis, error) {
	if !(step > 0) || !(to >= from) {
		return Axis{}, fmt.Errorf("axis from %g to %g nm in steps of %g nm is empty; need to ≥ from and step > 0", from, to, step)
	}
	n := math.Floor((to-from)/step+1e-9) + 1
	if !(n <= 1e5) {
		return Axis{}, fmt.Errorf("axis from %g to %g nm in steps of %g nm has more than 100,000 points", from, to, step)
	}
	nm := make([]float64, int(n))
	for i := range nm {
		nm[i] = from + float64(i)*step
	}
	return NewAxis(nm)
}

// Len returns the number of wavelengths.
func (a Axis) Len() int { return len(a.nm) }

// At returns wavelength i, nm. It panics outside the axis.
func (a Axis) At(i int) float64 { return a.nm[i] }

// First and Last return the ends, nm. They panic on an empty axis.
func (a Axis) First() float64 { return a.nm[0] }

// Last returns the longest wavelength, nm. It panics on an empty axis.
func (a Axis) Last() float64 { return a.nm[len(a.nm)-1] }

// Values returns a copy of the wavelengths, nm.
func (a Axis) Values() []float64 { return slices.Clone(a.nm) }

// Equal says whether both axes have the same points, to 1e-4 nm.
func (a Axis) Equal(b Axis) bool {
	return slices.EqualFunc(a.nm, b.nm, func(x, y float64) bool { return math.Abs(x-y) <= sameNM })
}

// Find returns the index of wavelength nm, to 1e-4 nm.
func (a Axis) Find(nm float64) (int, bool) {
	i := sort.SearchFloat64s(a.nm, nm-sameNM)
	return i, i < len(a.nm) && math.Abs(a.nm[i]-nm) <= sameNM
}

// Covers says whether nm lies within the axis, to 1e-4 nm.
func (a Axis) Covers(nm float64) bool {
	return len(a.nm) > 0 && nm >= a.nm[0]-sameNM && nm <= a.nm[len(a.nm)-1]+sameNM
}

// Bracket returns the interval that holds nm: the point lies at
// At(i) + w·(At(i+1) − At(i)), 0 ≤ w < 1. On a point of the axis w is 0, so that
// interpolation returns the measured value itself. ok is false outside.
func (a Axis) Bracket(nm float64) (i int, w float64, ok bool) {
	if i, ok := a.Find(nm); ok {
		return i, 0, true
	}
	i = sort.SearchFloat64s(a.nm, nm)
	if i == 0 || i == len(a.nm) {
		return 0, 0, false
	}
	i--
	return i, (nm - a.nm[i]) / (a.nm[i+1] - a.nm[i]), true
}

// Bridged says whether nm lies between two points of a that are no further apart
// than half again its usual step, or on a point: one scan that is missing among
// equally spaced ones is not bridged.
func (a Axis) Bridged(nm float64) bool { return !a.gap(nm, a.usualStep()) }

// gaps says which points of b lie in gaps of a.
func (a Axis) gaps(b Axis) []bool {
	usual := a.usualStep()
	out := make([]bool, b.Len())
	for i, nm := range b.nm {
		out[i] = a.gap(nm, usual)
	}
	return out
}

func (a Axis) gap(nm, usual float64) bool {
	i, w, ok := a.Bracket(nm)
	return ok && w > 0 && a.nm[i+1]-a.nm[i] > 1.5*usual+sameNM
}

// usualStep is the median distance of neighbours, the lower one of two, nm; infinite
// for fewer than four points, of which none is usual.
func (a Axis) usualStep() float64 {
	if len(a.nm) < 4 {
		return math.Inf(1)
	}
	d := make([]float64, len(a.nm)-1)
	for i := range d {
		d[i] = a.nm[i+1] - a.nm[i]
	}
	slices.Sort(d)
	return d[(len(d)-1)/2]
}

// Interp interpolates y, given on the axis, linearly at nm. It returns NaN
// outside the axis and where a neighbour it needs is NaN. It panics when y is
// not as long as the axis.
func (a Axis) Interp(y []float64, nm float64) float64 {
	if len(y) != len(a.nm) {
		panic(fmt.Sprintf("eem: %d values on an axis of %d", len(y), len(a.nm)))
	}
	i, w, ok := a.Bracket(nm)
	switch {
	case !ok:
		return math.NaN()
	case w == 0:
		return y[i]
	}
	return y[i] + w*(y[i+1]-y[i])
}

// Nearest returns the index of the wavelength nearest to nm, the shorter one of
// two equally near. It panics on an empty axis.
func (a Axis) Nearest(nm float64) int {
	i := sort.SearchFloat64s(a.nm, nm)
	if i == len(a.nm) || (i > 0 && nm-a.nm[i-1] <= a.nm[i]-nm) {
		i--
	}
	return i
}

// MarshalJSON writes the wavelengths as an array.
func (a Axis) MarshalJSON() ([]byte, error) { return json.Marshal(a.nm) }

// UnmarshalJSON reads an array of wavelengths and checks it like NewAxis.
func (a *Axis) UnmarshalJSON(b []byte) error {
	var nm []float64
	if err := json.Unmarshal(b, &nm); err != nil {
		return err
	}
	v, err := NewAxis(nm)
	if err == nil {
		*a = v
	}
	return err
}

// MarshalBinary writes the wavelengths, 8 bytes each.
func (a Axis) MarshalBinary() ([]byte, error) {
	return binary.Append(make([]byte, 0, 8*len(a.nm)), binary.LittleEndian, a.nm)
}

// UnmarshalBinary reads what MarshalBinary wrote and checks it like NewAxis; no
// bytes are the empty Axis.
func (a *Axis) UnmarshalBinary(b []byte) error {
	if len(b) == 0 {
		*a = Axis{}
		return nil
	}
	nm := make([]float64, len(b)/8)
	if n, err := binary.Decode(b, binary.LittleEndian, nm); err != nil || n != len(b) {
		return fmt.Errorf("a wavelength axis of %d bytes; 8 bytes are a wavelength", len(b))
	}
	v, err := NewAxis(nm)
	if err == nil {
		*a = v
	}
	return err
}

// String gives the ends and the number of points: "240–600 nm (73)".
func (a Axis) String() string {
	if a.Len() == 0 {
		return "empty axis"
	}
	return fmt.Sprintf("%s–%s nm (%d)", NM(a.First()), NM(a.Last()), a.Len())
}

// Grid is the pair of axes of an EEM.
type Grid struct {
	Ex Axis `json:"excitation_nm"` // J points
	Em Axis `json:"emission_nm"`   // K points
}

// Cells returns J·K.
func (g Grid) Cells() int { return g.Ex.Len() * g.Em.Len() }

// Index returns the place of cell (j, k) in row-major ex × em order.
func (g Grid) Index(j, k int) int { return j*g.Em.Len() + k }

// Equal says whether both grids have the same points, to 1e-4 nm.
func (g Grid) Equal(h Grid) bool { return g.Ex.Equal(h.Ex) && g.Em.Equal(h.Em) }

// String gives both axes.
func (g Grid) String() string { return "ex " + g.Ex.String() + ", em " + g.Em.String() }
