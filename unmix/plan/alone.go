package plan

import (
	"cmp"
	"math"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/scatter"
)

// Alone says where to excite one substance by itself.
type Alone struct {
	Absorbance *eem.Absorbance // of the expected bottle
	Excitation [2]float64      // nm that the instrument can send
	Emission   [2]float64      // nm of the emission window
	Bands      []scatter.Band  // that are removed
	PathCM     float64         // of the measuring cell
}

// Exciting is an excitation for one substance.
type Exciting struct {
	correct.Linearity
	A     float64   // decadic absorbance over the path
	Edge  bool      // at the end of what can be excited or was measured: the absorbance may rise beyond it
	Taken []Overlap // bands that lie in the emission window, in the order of Bands
	Lost  float64   // share of the emission window that they take
}

// Overlap is a scatter band in the emission window.
type Overlap struct {
	scatter.Band
	From, To float64 // nm, within the window
}

// peakRoom is how far on either side, nm, a maximum must be the highest: narrower
// ones are noise of the absorbance (common practice, no source).
const peakRoom = 8

// worthTelling is the share of the highest absorbance below which a maximum is none
// to excite at, and mostly noise (common practice, no source).
const worthTelling = 0.1

// Maxima returns the maxima of the absorbance among the excitations, highest first;
// empty where the absorbance covers none of them or is nowhere above 0.
func (a Alone) Maxima() []Exciting {
	var out []Exciting
	nm, v := a.inRange()
	for i := range nm {
		highest := v[i] > 0
		for l := range nm {
			if math.Abs(nm[l]-nm[i]) <= peakRoom && (v[l] > v[i] || v[l] == v[i] && l < i) {
				highest = false
			}
		}
		if highest {
			out = append(out, a.at(nm[i], i == 0 || i == len(nm)-1))
		}
	}
	slices.SortStableFunc(out, func(x, y Exciting) int { return cmp.Compare(y.A, x.A) })
	for i := range out {
		if out[i].A < worthTelling*out[0].A {
			return out[:i]
		}
	}
	return out
}

// Clear returns the excitation of highest absorbance whose scatter bands leave the
// whole emission window; ok is false where there is none.
func (a Alone) Clear() (best Exciting, ok bool) {
	nm, v := a.inRange()
	for i := range nm {
		if v[i] > 0 && (!ok || v[i] > best.A/a.PathCM) {
			if e := a.at(nm[i], i == 0 || i == len(nm)-1); len(e.Taken) == 0 {
				best, ok = e, true
			}
		}
	}
	return best, ok
}

// inRange returns wavelengths and absorbance of 1 cm among the excitations.
func (a Alone) inRange() (nm, v []float64) {
	for i := range a.Absorbance.Axis.Len() {
		w := a.Absorbance.Axis.At(i)
		if x := a.Absorbance.PerCM(w); w >= a.Excitation[0] && w <= a.Excitation[1] && x == x {
			nm, v = append(nm, w), append(v, x)
		}
	}
	return nm, v
}

// at judges excitation nm.
func (a Alone) at(nm float64, edge bool) Exciting {
	one, err := eem.NewAxis([]float64{nm})
	if err != nil {
		panic(err) // it is a point of an axis
	}
	e := Exciting{Linearity: correct.Linear(one, a.Absorbance, a.PathCM)[0], Edge: edge}
	e.A = e.X / math.Ln10
	for _, b := range a.Bands {
		lo, hi := b.Range(nm)
		if lo, hi = math.Max(lo, a.Emission[0]), math.Min(hi, a.Emission[1]); lo <= hi {
			e.Taken = append(e.Taken, Overlap{b, lo, hi})
		}
	}
	e.Lost = share(e.Taken, a.Emission)
	return e
}

// share of a window that bands take, each stretch once.
func share(taken []Overlap, window [2]float64) float64 {
	s := slices.Clone(taken)
	slices.SortFunc(s, func(x, y Overlap) int { return cmp.Compare(x.From, y.From) })
	sum, end := 0.0, math.Inf(-1)
	for _, o := range s {
		sum += math.Max(0, o.To-math.Max(o.From, end))
		end = math.Max(end, o.To)
	}
	return sum / (window[1] - window[0])
}
