package optics

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// Absorption returns the absorbance indices of the undiluted bottle, always the
// same ones in the same order. docMgL is its dissolved organic carbon, mg/L; 0
// or NaN where nobody measured it.
func Absorption(a *eem.Absorbance, docMgL float64) []Index {
	out := []Index{
		coefficient(a, 254), coefficient(a, 350), coefficient(a, 440),
		suva(a, docMgL), aromaticity(a, docMgL),
		slopeIndex(a, 275, 295), slopeIndex(a, 350, 400), slopeRatio(a),
		quotient(a, "e2_e3", 250, 365), quotient(a, "e4_e6", 465, 665),
	}
	for i := range out {
		out[i].U = math.NaN()
		out[i] = settled(out[i])
	}
	return out
}

// Napierian returns the Napierian absorption coefficient at nm, m⁻¹: ln(10)·A/l,
// l in m; NaN outside the spectrum.
func Napierian(a *eem.Absorbance, nm float64) float64 { return math.Ln10 * Decadic(a, nm) }

// Decadic returns the decadic absorption coefficient at nm, m⁻¹: A/l, l in m.
func Decadic(a *eem.Absorbance, nm float64) float64 {
	const cmPerM = 100
	return cmPerM * a.PerCM(nm)
}

// SUVA254 is the decadic absorption coefficient at 254 nm, m⁻¹, over DOC, mg/L:
// Weishaar et al. 2003, Environ. Sci. Technol. 37, 4702. Unit L mg⁻¹ m⁻¹.
func SUVA254(decadic254, docMgL float64) float64 { return decadic254 / docMgL }

// Aromaticity is the aromatic share of carbon, %, that SUVA254 points to:
// 6.52·SUVA + 3.63 (Weishaar et al. 2003, coefficients from memory; isolates).
func Aromaticity(suva float64) float64 { return 6.52*suva + 3.63 }

func lacks(a *eem.Absorbance, nm float64) string {
	return fmt.Sprintf("the absorbance spectrum (%s) has no value at %g nm", a.Axis, nm)
}

func coefficient(a *eem.Absorbance, nm float64) Index {
	ix := Index{Name: fmt.Sprintf("a%g", nm), Unit: "m⁻¹", Value: Napierian(a, nm),
		What: fmt.Sprintf("Napierian absorption coefficient at %g nm", nm), Source: "ln(10)·A/l"}
	if math.IsNaN(ix.Value) {
		ix.Refused = lacks(a, nm)
	}
	return ix
}

func suva(a *eem.Absorbance, doc float64) Index {
	ix := Index{Name: "suva254", Unit: "L mg⁻¹ m⁻¹", Value: SUVA254(Decadic(a, 254), doc),
		What: "decadic absorption coefficient at 254 nm over dissolved organic carbon", Source: "Weishaar et al. 2003, Environ. Sci. Technol. 37, 4702"}
	switch {
	case !(doc > 0):
		ix.Value, ix.Refused = math.NaN(), "no dissolved organic carbon is given (doc_mg_per_l)"
	case math.IsNaN(ix.Value):
		ix.Refused = lacks(a, 254)
	}
	return ix
}

func aromaticity(a *eem.Absorbance, doc float64) Index {
	s := suva(a, doc)
	return Index{Name: "aromaticity", Unit: "%", Value: Aromaticity(s.Value), Refused: s.Refused,
		What: "aromatic share of carbon, 6.52·SUVA + 3.63", Source: "Weishaar et al. 2003, coefficients from memory"}
}

func slopeIndex(a *eem.Absorbance, from, to float64) Index {
	ix := Index{Name: fmt.Sprintf("s_%g_%g", from, to), Unit: "nm⁻¹",
		What:   fmt.Sprintf("spectral slope %g–%g nm, regression of ln a", from, to),
		Source: "Helms et al. 2008, Limnol. Oceanogr. 53, 955"}
	v, err := Slope(a, from, to)
	ix.Value = v
	if err != nil {
		ix.Refused = err.Error()
	}
	return ix
}

func slopeRatio(a *eem.Absorbance) Index {
	ix := Index{Name: "s_r", What: "slope ratio, S275–295 / S350–400", Source: "Helms et al. 2008, Limnol. Oceanogr. 53, 955", Value: math.NaN()}
	n, d := slopeIndex(a, 275, 295), slopeIndex(a, 350, 400)
	switch {
	case n.Refused != "":
		ix.Refused = n.Refused
	case d.Refused != "":
		ix.Refused = d.Refused
	case d.Value == 0:
		ix.Refused = "the slope 350–400 nm is zero"
	default:
		ix.Value = n.Value / d.Value
	}
	return ix
}

func quotient(a *eem.Absorbance, name string, num, den float64) Index {
	n, d := Napierian(a, num), Napierian(a, den)
	ix := Index{Name: name, Value: n / d, What: fmt.Sprintf("absorption at %g over %g nm", num, den), Source: "from memory"}
	switch {
	case math.IsNaN(n):
		ix.Refused = lacks(a, num)
	case math.IsNaN(d):
		ix.Refused = lacks(a, den)
	case !(d > 0):
		ix.Value, ix.Refused = math.NaN(), fmt.Sprintf("the absorbance at %g nm is not positive", den)
	}
	return ix
}

// inWindow returns the measured points in from … to nm, at least minPoints, all
// positive when asked.
func inWindow(a *eem.Absorbance, from, to float64, positive bool) (x, y []float64, err error) {
	const minPoints = 3 // two give a line and no judgement
	if !a.Axis.Covers(from) || !a.Axis.Covers(to) {
		return nil, nil, fmt.Errorf("the absorbance spectrum (%s) does not cover %g–%g nm", a.Axis, from, to)
	}
	for i := range a.Axis.Len() {
		nm, v := a.Axis.At(i), 100*math.Ln10*a.A[i]/a.PathCM
		if nm < from-1e-4 || nm > to+1e-4 || math.IsNaN(v) {
			continue
		}
		if positive && !(v > 0) {
			return nil, nil, fmt.Errorf("the absorbance at %g nm is not positive", nm)
		}
		x, y = append(x, nm), append(y, v)
	}
	if len(x) < minPoints {
		return nil, nil, fmt.Errorf("the absorbance spectrum has %d points in %g–%g nm; a slope needs %d", len(x), from, to, minPoints)
	}
	return x, y, nil
}

// Slope returns the spectral slope S over from … to nm, nm⁻¹, of
// a(λ) = a₀·e^(−S·λ) by regression of ln a on λ.
func Slope(a *eem.Absorbance, from, to float64) (float64, error) {
	x, y, err := inWindow(a, from, to, true)
	if err != nil {
		return math.NaN(), err
	}
	for i, v := range y {
		y[i] = math.Log(v)
	}
	_, b := stat.LinearRegression(x, y, nil, false)
	return -b, nil
}

// SlopeDirect returns the same slope by least squares on a itself, which trusts
// the strong end of the window more and stands values that are not positive.
// It differs from Slope where there is noise; say which one was used.
func SlopeDirect(a *eem.Absorbance, from, to float64) (float64, error) {
	x, y, err := inWindow(a, from, to, false)
	if err != nil {
		return math.NaN(), err
	}
	a0, s := y[0], math.Log(math.Abs(y[0]/y[len(y)-1]))/(x[len(x)-1]-x[0])
	if math.IsNaN(s) || math.IsInf(s, 0) {
		s = 0.015 // nm⁻¹, an ordinary water
	}
	for range 100 {
		// Gauss–Newton on a₀·e^(−s·(λ−λ₀)): normal equations of two unknowns.
		var m11, m12, m22, b1, b2 float64
		for i := range x {
			d := x[i] - x[0]
			g1 := math.Exp(-s * d)
			g2, r := -a0*d*g1, y[i]-a0*g1
			m11, m12, m22 = m11+g1*g1, m12+g1*g2, m22+g2*g2
			b1, b2 = b1+g1*r, b2+g2*r
		}
		det := m11*m22 - m12*m12
		da, ds := (m22*b1-m12*b2)/det, (m11*b2-m12*b1)/det
		a0, s = a0+da, s+ds
		if math.Abs(ds) <= 1e-12*math.Abs(s) {
			return s, nil
		}
		if math.IsNaN(s) || math.Abs(s) > 1 {
			break
		}
	}
	return math.NaN(), fmt.Errorf("no exponential fits the absorbance in %g–%g nm", from, to)
}
