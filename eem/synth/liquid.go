package synth

import (
	"math/rand/v2"

	"tarnlight/eem"
)

// Fluorophore is a substance, or an extract that behaves as one. Its yield and
// the shape of its emission do not depend on the excitation.
type Fluorophore struct {
	Name string
	Unit string // of an Amount: "µg/L"

	Absorbs Band    // decadic, cm⁻¹ for one Unit: light that can become fluorescence
	Inert   Tail    // decadic, cm⁻¹ for one Unit: what the extract absorbs beside
	Emits   Band    // photons per nm, any scale
	Yield   float64 // photons out for a photon absorbed by Absorbs
}

// Absorption returns the decadic absorption coefficient at nm, cm⁻¹ for one
// Unit.
func (f *Fluorophore) Absorption(nm float64) float64 { return f.Absorbs.At(nm) + f.Inert.At(nm) }

// Dose is an amount of a fluorophore in a liquid.
type Dose struct {
	Of     *Fluorophore
	Amount float64 // in Of.Unit
}

// Liquid is what fills a cell. The zero Liquid is pure water.
type Liquid struct {
	Doses []Dose
	Color Tail // of dissolved matter that absorbs and does not fluoresce

	// Turbidity is the scattering coefficient of particles at 350 nm, cm⁻¹;
	// it goes with λ^−1.5. Pure water scatters 1e-4 cm⁻¹ there. The light that
	// particles take from the beam is neglected.
	Turbidity float64
}

// Amount returns how much of f, known by its name, the liquid holds, in f.Unit.
func (l Liquid) Amount(f *Fluorophore) float64 {
	sum := 0.0
	for _, d := range l.Doses {
		if d.Of.Name == f.Name {
			sum += d.Amount
		}
	}
	return sum
}

// With returns the liquid with more in it; the volume stays.
func (l Liquid) With(doses ...Dose) Liquid {
	all := make([]Dose, 0, len(l.Doses)+len(doses))
	l.Doses = append(append(all, l.Doses...), doses...)
	return l
}

// Diluted returns the liquid brought to factor times its volume with pure
// water.
func (l Liquid) Diluted(factor float64) Liquid {
	doses := make([]Dose, len(l.Doses))
	for i, d := range l.Doses {
		doses[i] = Dose{d.Of, d.Amount / factor}
	}
	l.Doses = doses
	l.Color.At254 /= factor
	l.Turbidity /= factor
	return l
}

// AbsorbanceAt returns the decadic absorbance of 1 cm at nm.
func (l Liquid) AbsorbanceAt(nm float64) float64 {
	sum := l.Color.At(nm)
	for _, d := range l.Doses {
		sum += d.Amount * d.Of.Absorption(nm)
	}
	return sum
}

func (l Liquid) absorbanceOn(a eem.Axis) []float64 {
	v := make([]float64, a.Len())
	for i := range v {
		v[i] = l.AbsorbanceAt(a.At(i))
	}
	return v
}

// Photometer measures absorbance against pure water.
type Photometer struct {
	Axis     eem.Axis
	PathCM   float64
	Noise    float64 // standard deviation of a reading
	Baseline float64 // standard deviation of an error that a whole spectrum shares
}

// NewPhotometer returns one of good quality: 230–620 nm in steps of 2, a cell of
// 1 cm.
func NewPhotometer() *Photometer {
	return &Photometer{Axis: steps(230, 620, 2), PathCM: 1, Noise: 2e-4, Baseline: 5e-4}
}

// Scan measures a liquid. Without a generator there are no errors.
func (p *Photometer) Scan(l Liquid, rnd *rand.Rand) *eem.Absorbance {
	a := l.absorbanceOn(p.Axis)
	base := 0.0
	if rnd != nil {
		base = p.Baseline * rnd.NormFloat64()
	}
	for i := range a {
		a[i] = a[i]*p.PathCM + base
		if rnd != nil {
			a[i] += p.Noise * rnd.NormFloat64()
		}
	}
	return &eem.Absorbance{Axis: p.Axis, A: a, PathCM: p.PathCM}
}
