package synth

import (
	"math"
	"math/rand/v2"

	"tarnlight/eem"
)

// Instrument is a right-angle fluorometer with a 1 cm cell. NewInstrument gives
// one whose numbers resemble real ones; copy it and change fields.
type Instrument struct {
	eem.Grid

	// Lamp and Detector are the light that reaches the cell and the response
	// to the light that leaves it, photons, relative to 350 and 450 nm.
	Lamp, Detector Band
	Power          float64 // of the lamp that day, 1 as new
	Closed         bool    // the shutter: no light reaches the cell

	// The detector sees the stretch ExWindow of the exciting beam, cm from the
	// wall where it enters, and EmWindow on the way out, cm from the wall where
	// the emission leaves. Equal ends are one depth: {0.5, 0.5} is the centre
	// form, {0, 0} no inner filter at all.
	ExWindow, EmWindow [2]float64

	// Bandpass is the full width at half maximum of the excitation and the
	// emission monochromator, nm. It widens the scatter lines; the bands of a
	// Fluorophore are given as seen through it.
	Bandpass    [2]float64
	SecondOrder float64 // share of scattered light that the emission grating passes in second order

	// Off is how many nanometres the light lies above what the excitation and
	// the emission monochromator show.
	Off [2]float64

	Gain       float64 // counts per cm⁻¹ nm⁻¹ of light sent to the detector, at Lamp = Detector = 1
	PerPhoton  float64 // counts a photon: shot noise has variance PerPhoton·signal
	Offset     float64 // counts without light
	Read       float64 // standard deviation of the electronics, counts
	Saturation float64 // most counts that the detector can report; 0 no limit
}

// NewInstrument returns the instrument of the demo: ex 240–450 nm in steps of 5
// (J = 43), em 280–600 nm in steps of 2 (K = 161), 3 nm bandpass, a window of
// 2 mm around the centre, for which the centre form of the inner filter is right
// to 0.2 % at an absorbance of 0.5. Water's Raman line at ex 350 nm reaches
// some 12,000 counts.
func NewInstrument() *Instrument {
	return &Instrument{
		Grid: eem.Grid{Ex: steps(240, 450, 5), Em: steps(280, 600, 2)},
		Lamp: Band{{At: 22500, Width: 6500, Height: 1}, {At: 34000, Width: 5000, Height: 0.35},
			{At: 25200, Width: 500, Height: 0.06}},
		Detector: Band{{At: 22000, Width: 8000, Height: 1}, {At: 26300, Width: 900, Height: 0.10},
			{At: 18500, Width: 1500, Height: -0.08}},
		Power:    1,
		ExWindow: [2]float64{0.4, 0.6}, EmWindow: [2]float64{0.4, 0.6},
		Bandpass: [2]float64{3, 3}, SecondOrder: 0.03,
		Gain: 6e9, PerPhoton: 1, Offset: 60, Read: 4, Saturation: 7e5,
	}
}

// Scan measures a liquid and returns raw counts; every cell holds a number.
// Without a generator there is no noise. A cell's counts are
//
//	Offset + Gain·Power·Lamp(ex)·Detector(em)·T_ex·T_em·[Σ ln10·c·ε(ex)·Φ·s(em) + scatter]
//
// with c·ε the decadic absorption of a fluorophore, s its emission of area 1
// and T the mean transmission over the viewed windows, which is the integral of
// Beer and Lambert's law over them.
func (in *Instrument) Scan(l Liquid, rnd *rand.Rand) *eem.EEM {
	e := eem.FromCells(in.Grid, eem.Counts, make([]float64, in.Cells()))
	if !in.Closed {
		e.Ex, e.Em = shifted(in.Ex, in.Off[0]), shifted(in.Em, in.Off[1])
		in.addFluorescence(e, l)
		in.addScatter(e, l)
		e.Grid = in.Grid
	}
	for i, v := range e.F {
		v += in.Offset
		if rnd != nil {
			v += math.Sqrt(in.Read*in.Read+in.PerPhoton*e.F[i]) * rnd.NormFloat64()
		}
		if in.Saturation > 0 {
			v = min(v, in.Saturation)
		}
		e.F[i] = v
	}
	return e
}

// shifted returns the axis moved by off nm.
func shifted(a eem.Axis, off float64) eem.Axis {
	if off == 0 {
		return a
	}
	nm := a.Values()
	for i := range nm {
		nm[i] += off
	}
	b, err := eem.NewAxis(nm)
	if err != nil {
		panic(err)
	}
	return b
}

// Ideal returns what a perfect correction makes of the liquid: fluorescence in
// Raman units, nm⁻¹, without scatter, inner filter and noise.
func (in *Instrument) Ideal(l Liquid) *eem.EEM {
	e := eem.FromCells(in.Grid, eem.Raman, make([]float64, in.Cells()))
	for _, d := range l.Doses {
		ex, em := d.onGrid(in.Grid)
		for j, a := range ex {
			a /= ramanCoefficient(350)
			for k, row := 0, e.Row(j); k < len(row); k++ {
				row[k] += a * em[k]
			}
		}
	}
	return e
}

// onGrid returns ln10·c·ε(ex)·Φ, cm⁻¹, and s(em), nm⁻¹.
func (d Dose) onGrid(g eem.Grid) (ex, em []float64) {
	ex, em = d.Of.Absorbs.on(g.Ex), d.Of.Emits.on(g.Em)
	for j := range ex {
		ex[j] *= math.Ln10 * d.Amount * d.Of.Yield
	}
	area := d.Of.Emits.Area()
	for k := range em {
		em[k] /= area
	}
	return ex, em
}

func (in *Instrument) addFluorescence(e *eem.EEM, l Liquid) {
	tEx, tEm := l.absorbanceOn(e.Ex), l.absorbanceOn(e.Em)
	lamp := in.Lamp.At(350)
	for j, a := range tEx {
		tEx[j] = transmission(a, in.ExWindow) * in.Gain * in.Power * in.Lamp.At(e.Ex.At(j)) / lamp
	}
	detector := in.Detector.At(450)
	for k, a := range tEm {
		tEm[k] = transmission(a, in.EmWindow) * in.Detector.At(e.Em.At(k)) / detector
	}
	for _, d := range l.Doses {
		ex, em := d.onGrid(e.Grid)
		for k := range em {
			em[k] *= tEm[k]
		}
		for j, a := range ex {
			a *= tEx[j]
			for k, row := 0, e.Row(j); k < len(row); k++ {
				row[k] += a * em[k]
			}
		}
	}
}

// addScatter adds the lines out to 7 standard deviations, 2e-11 of their
// height.
func (in *Instrument) addScatter(e *eem.EEM, l Liquid) {
	const far = 7
	for j := range e.Ex.Len() {
		ex := e.Ex.At(j)
		front := in.Gain * in.Power * in.Lamp.At(ex) / in.Lamp.At(350) * transmission(l.AbsorbanceAt(ex), in.ExWindow)
		for _, s := range in.lines(ex, l.Turbidity) {
			if s.area == 0 || s.at+far*s.sigma < e.Em.First() || s.at-far*s.sigma > e.Em.Last() {
				continue
			}
			height := front * s.area / (s.sigma * math.Sqrt(2*math.Pi)) *
				transmission(l.AbsorbanceAt(s.light), in.EmWindow) * in.Detector.At(s.light) / in.Detector.At(450)
			row := e.Row(j)
			for k := e.Em.Nearest(s.at - far*s.sigma); k < len(row) && e.Em.At(k) < s.at+far*s.sigma; k++ {
				z := (e.Em.At(k) - s.at) / s.sigma
				row[k] += height * math.Exp(-z*z/2)
			}
		}
	}
}

// transmission returns the mean of 10^(−A·x) over the window, cm; a is the
// decadic absorbance of 1 cm.
func transmission(a float64, window [2]float64) float64 {
	n := math.Ln10 * a
	front := math.Exp(-n * window[0])
	if x := n * (window[1] - window[0]); x != 0 {
		return front * -math.Expm1(-x) / x
	}
	return front
}

// ExcitationFactors returns the factors that undo the lamp, 1 at 350 nm.
func (in *Instrument) ExcitationFactors(a eem.Axis) []float64 { return inverse(in.Lamp, a, 350) }

// EmissionFactors returns the factors that undo the detector, 1 at 450 nm.
func (in *Instrument) EmissionFactors(a eem.Axis) []float64 { return inverse(in.Detector, a, 450) }

func inverse(b Band, a eem.Axis, one float64) []float64 {
	v := b.on(a)
	for i := range v {
		v[i] = b.At(one) / v[i]
	}
	return v
}
