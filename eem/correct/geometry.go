package correct

import (
	"fmt"
	"math"
)

// Forms of the measuring cell.
const (
	RightAngle   = "right-angle"  // emission leaves at 90° to the excitation
	FrontFace    = "front-face"   // emission leaves through the face where the excitation enters
	Transmission = "transmission" // emission leaves through the face opposite to it
)

// Geometry says how light passes through the liquid, all of it collimated.
//
// Ex is the stretch, cm along the excitation from where it enters the liquid,
// that the detector sees; Em the stretch, cm along the emission back from where
// it leaves the liquid, that is excited. Front-face and transmission have one
// stretch, Ex. A zero stretch is the middle of the cell for right-angle (the
// common centre form) and the whole path for the others.
type Geometry struct {
	Form   string // RightAngle (also empty), FrontFace, Transmission
	Ex, Em [2]float64
	PathCM float64 // inner width of the cell, cm; 0 means 1

	// InDeg and OutDeg are the angles in air, degrees from the normal of the face, at
	// which light of a front-face or transmission cell enters and is seen. In the
	// liquid it goes at arcsin(sin θ/n), so that a depth x is passed over x/cos of that.
	InDeg, OutDeg float64
}

// nWater is the refractive index of water (589 nm, 25 °C, from memory).
const nWater = 1.333

// slant is the path in the liquid for a unit of depth, of light that meets the face
// at deg in air (Snell's law; the parallel walls of a window change nothing).
func slant(deg float64) float64 {
	s := math.Sin(deg*math.Pi/180) / nWater
	return 1 / math.Sqrt(1-s*s)
}

// attenuation is β of excitation and emission per cm of depth.
func (g Geometry) attenuation(aEx, aEm float64) (bx, bm float64) {
	bx, bm = math.Ln10*aEx, math.Ln10*aEm
	if g.Form == FrontFace || g.Form == Transmission {
		bx, bm = bx*slant(g.InDeg), bm*slant(g.OutDeg)
	}
	return bx, bm
}

// Check says what is wrong with g: an unknown form or a stretch outside the cell.
func (g Geometry) Check() error {
	switch g.Form {
	case "", RightAngle, FrontFace, Transmission:
	default:
		return fmt.Errorf("inner-filter form %q is unknown; use %s, %s or %s", g.Form, RightAngle, FrontFace, Transmission)
	}
	if !(g.path() > 0) || math.IsInf(g.path(), 0) {
		return fmt.Errorf("cell path %g cm; it must be positive", g.PathCM)
	}
	for _, w := range [2][2]float64{g.Ex, g.Em} {
		if w != [2]float64{} && !(w[0] >= 0 && w[1] >= w[0] && w[1] <= g.path()) {
			return fmt.Errorf("viewed window %g–%g cm does not lie in a cell of %g cm", w[0], w[1], g.path())
		}
	}
	for _, deg := range [2]float64{g.InDeg, g.OutDeg} {
		if !(deg >= 0 && deg < 90) {
			return fmt.Errorf("an angle of %g°; it lies from 0 to below 90° from the normal of the face", deg)
		}
	}
	return nil
}

func (g Geometry) path() float64 {
	if g.PathCM == 0 {
		return 1
	}
	return g.PathCM
}

// Factor returns true over observed intensity for a liquid of decadic absorbance
// aEx and aEm per cm at the excitation and the emission. With β = ln10·a (over the
// cosine of its angle in the liquid, where the face is not met straight on) the
// light of a slice at depth x is weakened by e^(−βx), and its mean over a
// stretch of centre m and width w is e^(−βm)·sinh(βw/2)/(βw/2). Hence
//
//	right-angle   k = k(β_ex; Ex) · k(β_em; Em)
//	front-face    k = k(β_ex + β_em; Ex)
//	transmission  k = k(β_ex − β_em; Ex) · e^(β_em·L)
//
// with k(β; m, w) = e^(βm)·(βw/2)/sinh(βw/2): Parker & Barnes, Analyst 1957, 82,
// 606 (right-angle; from memory), the others by the same integration. A stretch
// of width 0 in the middle of a 1 cm cell gives 10^((aEx+aEm)/2), the centre
// form of Parker & Rees, Analyst 1962, 87, 83. It panics on an unknown form.
func (g Geometry) Factor(aEx, aEm float64) float64 {
	bx, bm := g.attenuation(aEx, aEm)
	switch g.Form {
	case "", RightAngle:
		return meanInverse(bx, g.stretch(g.Ex)) * meanInverse(bm, g.stretch(g.Em))
	case FrontFace:
		return meanInverse(bx+bm, g.stretch(g.Ex))
	case Transmission:
		return meanInverse(bx-bm, g.stretch(g.Ex)) * math.Exp(bm*g.path())
	}
	panic(fmt.Sprintf("correct: unknown inner-filter form %q", g.Form))
}

// Factors returns Factor for every pair of absorbances per cm, len(ax) × len(am)
// row-major. Right-angle, a product of one number for each excitation and one
// for each emission, takes a sum of calls to exp and not a product.
func (g Geometry) Factors(ax, am []float64) []float64 {
	out := make([]float64, 0, len(ax)*len(am))
	if g.Form != "" && g.Form != RightAngle {
		for _, x := range ax {
			for _, m := range am {
				out = append(out, g.Factor(x, m))
			}
		}
		return out
	}
	km := make([]float64, len(am))
	for k, m := range am {
		km[k] = meanInverse(math.Ln10*m, g.stretch(g.Em))
	}
	for _, x := range ax {
		kx := meanInverse(math.Ln10*x, g.stretch(g.Ex))
		for _, m := range km {
			out = append(out, kx*m)
		}
	}
	return out
}

// stretch gives the viewed stretch with the meaning of zero filled in.
func (g Geometry) stretch(w [2]float64) [2]float64 {
	if w != [2]float64{} {
		return w
	}
	if g.Form == FrontFace || g.Form == Transmission {
		return [2]float64{0, g.path()}
	}
	return [2]float64{g.path() / 2, g.path() / 2}
}

// meanInverse is 1 over the mean of e^(−βx) for x in w.
func meanInverse(b float64, w [2]float64) float64 {
	m, z := (w[0]+w[1])/2, b*(w[1]-w[0])/2
	if z == 0 {
		return math.Exp(b * m)
	}
	return math.Exp(b*m) * z / math.Sinh(z)
}
