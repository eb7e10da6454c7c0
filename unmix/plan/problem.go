package plan

import (
	"errors"
	"fmt"
	"math"

	"tarnlight/unmix"
)

// Problem is what scans are chosen for. The candidates are the excitations of the
// set's grid.
type Problem struct {
	Set *unmix.Set
	// Level is the amount of each component in a typical bottle, F, in the unit of
	// its contribution: what uncertainties are relative to, and whose light makes
	// shot noise.
	Level []float64
	// Want says whose value is asked for, F; nil: all. The others are kept apart all
	// the same: they stay in the fit and do not count in the choice.
	Want []bool

	Noise  Noise
	Factor []float64 // J × K, what the inner filter of a typical bottle multiplies a cell by; nil: 1
	// Unknown are emission bands of interferents that nobody has a reference of. At
	// every excitation each may have any height, so that a plan made with them still
	// tells the components from such a thing, whatever excites it. That light's own
	// shot noise is neglected.
	Unknown []Emission

	Window    Window
	WorstCase bool // the largest relative uncertainty counts, not their root mean square
}

// Noise is the two-term noise of a detector, in the intensity unit of the set, on
// its grid (J × K each): a cell of intensity F has the variance
//
//	factor²·Read2 + factor·Shot·(F + Water) + (Read2 + Shot·Water)/Blanks
//
// with factor that of the inner filter: it dims the light, and the correction
// multiplies what is left together with its noise.
type Noise struct {
	Read2  []float64 // variance without light
	Shot   []float64 // variance for one of intensity
	Water  []float64 // intensity of the blank; nil: 0
	Blanks int       // how many blanks the subtracted one is the mean of; 0: none is subtracted

	// Misfit is the variance by which bottles depart from the model beyond noise; nil:
	// 0. AlikeNM says how far departures are alike, nm along excitation and emission:
	// the correlation of two cells falls as exp(−distance/AlikeNM), 0 for none. With τ
	// the number of cells that then count as one, τ·mean of Misfit·(KᵀK)⁻¹ is added to
	// the covariance, as merit does it, so that scans close together bring little.
	// Detection limits have no part of it: it makes a decision doubtful, not lenient.
	Misfit  []float64
	AlikeNM [2]float64
}

// Even is the noise of a detector that is the same everywhere on a grid of so many
// cells: read is its standard deviation without light, shot its variance for one of
// intensity.
func Even(cells int, read, shot float64, blanks int) Noise {
	n := Noise{Read2: make([]float64, cells), Shot: make([]float64, cells), Blanks: blanks}
	for i := range cells {
		n.Read2[i], n.Shot[i] = read*read, shot
	}
	return n
}

// dark is the variance of a cell without any of the components, light what one of
// their intensity adds.
func (p *Problem) dark(i int) float64 {
	n, f := &p.Noise, p.factor(i)
	water := 0.0
	if n.Water != nil {
		water = math.Max(0, n.Water[i])
	}
	v := f*f*n.Read2[i] + f*n.Shot[i]*water
	if n.Blanks > 0 {
		v += (n.Read2[i] + n.Shot[i]*water) / float64(n.Blanks)
	}
	return v
}

func (p *Problem) misfit(i int) float64 {
	if p.Noise.Misfit == nil || !(p.Noise.Misfit[i] > 0) {
		return 0
	}
	return p.Noise.Misfit[i]
}

func (p *Problem) light(i int) float64 { return p.factor(i) * p.Noise.Shot[i] }

func (p *Problem) factor(i int) float64 {
	if p.Factor == nil {
		return 1
	}
	return p.Factor[i]
}

// Emission is an emission band: a Gaussian in energy, where the bands of molecules
// are nearly symmetric.
type Emission struct {
	AtNM    float64 // of its maximum
	WidthNM float64 // full width at half maximum
}

// at returns the height at nm.
func (e Emission) at(nm float64) float64 {
	sigma := 1e7 * e.WidthNM / (e.AtNM * e.AtNM) / (2 * math.Sqrt(2*math.Ln2)) // cm⁻¹
	z := (1e7/nm - 1e7/e.AtNM) / sigma
	return math.Exp(-z * z / 2)
}

// Window is the part of the emission axis that is scanned: points From … To−1,
// every Stride-th. The zero Window is all of it.
type Window struct{ From, To, Stride int }

func (w Window) has(k int) bool {
	return w.To == 0 || k >= w.From && k < w.To && (k-w.From)%max(1, w.Stride) == 0
}

// check panics where the caller erred and says what cannot be worked on.
func (p *Problem) check() error {
	f, cells := p.Set.Len(), p.Set.Grid.Cells()
	if len(p.Level) != f || p.Want != nil && len(p.Want) != f || len(p.Noise.Read2) != cells || len(p.Noise.Shot) != cells ||
		p.Noise.Water != nil && len(p.Noise.Water) != cells || p.Noise.Misfit != nil && len(p.Noise.Misfit) != cells || p.Factor != nil && len(p.Factor) != cells {
		panic("plan: levels, noise and factors do not have the lengths of the set")
	}
	if err := p.Set.Check(); err != nil {
		return err
	}
	wanted := false
	for h, c := range p.Set.Components {
		if !(p.Level[h] > 0) || math.IsInf(p.Level[h], 0) {
			return fmt.Errorf("%s has the typical level %g; it must be above 0", c.Name, p.Level[h])
		}
		wanted = wanted || p.Want == nil || p.Want[h]
	}
	if !wanted {
		return errors.New("no component's value is asked for; leave at least one that is not only kept apart")
	}
	return nil
}
