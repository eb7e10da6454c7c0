package correct

import (
	"math"

	"tarnlight/eem"
)

// Sensitivity returns ∂ln k/∂aEx and ∂ln k/∂aEm of the factor k = g.Factor(aEx,
// aEm), cm: by how much k changes, relative, for a change of the absorbance per
// cm. In the centre form of a 1 cm cell both are ln(10)/2.
func (g Geometry) Sensitivity(aEx, aEm float64) (dEx, dEm float64) {
	bx, bm := g.attenuation(aEx, aEm)
	sx, sm := g.attenuation(1, 1) // dβ/da
	switch g.Form {
	case FrontFace:
		d := logSlope(bx+bm, g.stretch(g.Ex))
		return sx * d, sm * d
	case Transmission:
		d := logSlope(bx-bm, g.stretch(g.Ex))
		return sx * d, sm * (g.path() - d)
	}
	return math.Ln10 * logSlope(bx, g.stretch(g.Ex)), math.Ln10 * logSlope(bm, g.stretch(g.Em))
}

// logSlope is d ln meanInverse(b, w)/db = m − (w/2)·(coth z − 1/z), z = b·w/2.
func logSlope(b float64, w [2]float64) float64 {
	m, half := (w[0]+w[1])/2, (w[1]-w[0])/2
	z := b * half
	if math.Abs(z) < 1e-3 { // coth z − 1/z = z/3 − z³/45 + …; the next term is below 1e-15·z
		return m - half*(z/3-z*z*z/45)
	}
	return m - half*(1/math.Tanh(z)-1/z)
}

// AbsorbanceCauses appends to e, corrected by InnerFilter, what an uncertain
// absorbance means for all its cells together: the spectrum's baseline (u, per
// cm, the same at every wavelength) and its path (uPath, relative). bottle is the
// id; the absorbance is its own and so are the errors. Errors of single
// wavelengths are no part of this: with u each they add k·√(sEx² + sEm²)·u to a
// cell, s as in Sensitivity, and average out over the cells.
func AbsorbanceCauses(e *eem.EEM, a *eem.Absorbance, g Geometry, u, uPath float64, bottle string) *eem.EEM {
	out := e.Clone()
	if a == nil {
		return out
	}
	base, path := make([]float64, len(e.F)), make([]float64, len(e.F))
	ax, am := perCM(a, e.Ex), perCM(a, e.Em)
	for j := range ax {
		for k := range am {
			i := e.Index(j, k)
			sx, sm := g.Sensitivity(ax[j], am[k])
			base[i] = e.F[i] * (sx + sm) * u
			path[i] = -e.F[i] * (sx*ax[j] + sm*am[k]) * uPath
		}
	}
	if u > 0 {
		out.Causes = append(out.Causes, eem.Cause{Name: "absorbance baseline", Scope: eem.OfBottle, Key: bottle, Shape: base})
	}
	if uPath > 0 {
		out.Causes = append(out.Causes, eem.Cause{Name: "absorbance path", Scope: eem.OfBottle, Key: bottle, Shape: path})
	}
	return out
}
