package correct

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
)

// Curve is a spectrum on its own axis: a certificate, a lamp or a measured scan.
type Curve struct {
	Axis   eem.Axis
	Y      []float64 // same length as Axis
	U      []float64 // standard uncertainty, unit of Y, same length; nil where nobody knows it
	Source string
}

// Photons turns a curve in energy units into one in photon units, as N ∝ λ·E,
// left unchanged at refNM. Sources differ in which one they certify: ask.
func (c Curve) Photons(refNM float64) Curve {
	return c.weigh(func(nm float64) float64 { return nm / refNM })
}

// Energy turns a curve in photon units into one in energy units, left unchanged
// at refNM.
func (c Curve) Energy(refNM float64) Curve {
	return c.weigh(func(nm float64) float64 { return refNM / nm })
}

func (c Curve) weigh(by func(nm float64) float64) Curve {
	out := Curve{Axis: c.Axis, Y: slices.Clone(c.Y), U: slices.Clone(c.U), Source: c.Source}
	for i := range out.Y {
		w := by(c.Axis.At(i))
		out.Y[i] *= w
		if out.U != nil {
			out.U[i] *= w
		}
	}
	return out
}

// FactorsFrom makes the spectral factors that bring a measured scan of a
// reference material (blank subtracted, bandpass no wider than the
// certificate's) or of a calibrated lamp to its certified spectrum:
//
//	C(λ) = certified(λ) / measured(λ),  u(C)²/C² = u(cert)²/cert² + u(meas)²/meas²
//
// at the certificate's wavelengths that the scan covers (interpolated linearly
// between its points). Points where the certificate is below floor times its
// maximum are left out: near zero the quotient is noise (0 means 0.01). ASTM
// E3029-15, routes with certified reference materials and calibrated sources.
func FactorsFrom(cert, scan Curve, floor float64) (*Factors, error) {
	if floor == 0 {
		floor = 0.01
	}
	if len(cert.Y) == 0 || len(scan.Y) == 0 {
		return nil, fmt.Errorf("the certificate of %s or its scan is empty", cert.Source)
	}
	top := slices.Max(cert.Y)
	var nm, c, u []float64
	for i, want := range cert.Y {
		at := cert.Axis.At(i)
		got := scan.Axis.Interp(scan.Y, at)
		if math.IsNaN(got) || !(want >= floor*top) {
			continue
		}
		if !(got > 0) {
			return nil, fmt.Errorf("the scan of %s is %g at %g nm; a factor needs light there: scan the material again or cut the range", cert.Source, got, at)
		}
		nm, c = append(nm, at), append(c, want/got)
		if cert.U != nil || scan.U != nil {
			u = append(u, want/got*math.Hypot(relative(cert, at), relative(scan, at)))
		}
	}
	if len(nm) < 2 {
		return nil, fmt.Errorf("the scan (%s) and the certificate of %s (%s) share fewer than two wavelengths", scan.Axis, cert.Source, cert.Axis)
	}
	return NewFactors(nm, c, u, cert.Source)
}

// relative is the relative standard uncertainty at nm, 0 where none is known.
func relative(c Curve, nm float64) float64 {
	if c.U == nil {
		return 0
	}
	return c.Axis.Interp(c.U, nm) / c.Axis.Interp(c.Y, nm)
}

// Join makes one table of sections that overlap, as of several reference
// materials: each is scaled to the one before by least squares over the overlap,
//
//	k = Σ w·C₁·C₂ / Σ w·C₂²,  w = 1/(u₁² + u₂²)
//
// (w = 1 where an uncertainty is missing), and points of the overlap are the
// mean weighted by 1/u². Sections may come in any order; the result is scaled
// like the one of the shortest wavelengths.
func Join(sections ...*Factors) (*Factors, error) {
	if len(sections) == 0 {
		return nil, errors.New("no section of factors to join")
	}
	s := slices.Clone(sections)
	slices.SortStableFunc(s, func(a, b *Factors) int { return cmp.Compare(a.Axis.First(), b.Axis.First()) })
	out := s[0]
	for _, next := range s[1:] {
		j, err := join(out, next)
		if err != nil {
			return nil, err
		}
		out = j
	}
	return out, nil
}

// join joins b, which starts later, to a.
func join(a, b *Factors) (*Factors, error) {
	nm := slices.Concat(a.Axis.Values(), b.Axis.Values())
	slices.Sort(nm)
	nm = slices.CompactFunc(nm, func(x, y float64) bool { return math.Abs(y-x) <= 1e-4 })
	ax, err := eem.NewAxis(nm)
	if err != nil {
		return nil, err
	}
	ca, ra := a.On(ax)
	cb, rb := b.On(ax)
	known := a.U != nil && b.U != nil
	k := overlapScale(ca, ra, cb, rb, known)
	if math.IsNaN(k) {
		return nil, fmt.Errorf("the sections %s (%s) and %s (%s) do not overlap; without an overlap their scales cannot be joined", a.Source, a.Axis, b.Source, b.Axis)
	}
	c, u := make([]float64, len(nm)), make([]float64, len(nm))
	for i := range nm {
		x, y := ca[i], k*cb[i]
		ux, uy := x*ra[i], y*rb[i]
		switch {
		case math.IsNaN(y):
			c[i], u[i] = x, ux
		case math.IsNaN(x):
			c[i], u[i] = y, uy
		case known && ux > 0 && uy > 0:
			wx, wy := 1/(ux*ux), 1/(uy*uy)
			c[i], u[i] = (wx*x+wy*y)/(wx+wy), 1/math.Sqrt(wx+wy)
		default:
			c[i], u[i] = (x+y)/2, math.Hypot(ux, uy)/2
		}
	}
	if !known {
		u = nil
	}
	return NewFactors(nm, c, u, a.Source+" + "+b.Source)
}

// overlapScale is k = Σ w·a·b / Σ w·b² where both curves have values, with relative
// uncertainties ra and rb; NaN where they share none.
func overlapScale(a, ra, b, rb []float64, known bool) float64 {
	num, den := 0.0, 0.0
	for i := range a {
		if math.IsNaN(a[i]) || math.IsNaN(b[i]) {
			continue
		}
		w := 1.0
		if u2 := math.Pow(a[i]*ra[i], 2) + math.Pow(b[i]*rb[i], 2); known && u2 > 0 {
			w = 1 / u2
		}
		num, den = num+w*a[i]*b[i], den+w*b[i]*b[i]
	}
	return num / den
}

// ScaledAt returns the factors divided by their value at refNM, which must be
// covered: 1 there.
func (f *Factors) ScaledAt(refNM float64) (*Factors, error) {
	if !f.Axis.Covers(refNM) {
		return nil, fmt.Errorf("the factors (%s) do not cover the reference wavelength %g nm", f.Axis, refNM)
	}
	one, err := eem.NewAxis([]float64{refNM})
	if err != nil {
		return nil, err
	}
	at, _ := f.On(one)
	c, u := slices.Clone(f.Factor), slices.Clone(f.U)
	for i := range c {
		c[i] /= at[0]
		if u != nil {
			u[i] /= at[0]
		}
	}
	return NewFactors(f.Axis.Values(), c, u, f.Source)
}
