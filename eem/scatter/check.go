package scatter

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"tarnlight/eem"
)

// finding makes the note of a test. It panics on a code that is not on the list.
func finding(code string, value, limit float64, msg string) eem.Note {
	t, ok := eem.FindTest(code)
	if !ok {
		panic(fmt.Sprintf("scatter: test code %q is not on the list", code))
	}
	return eem.Note{Step: Step, Test: code, Severity: t.Severity, Value: value, Limit: limit, Measure: true, Msg: msg}
}

func defaultLimit(code string, limit float64) float64 {
	if limit != 0 {
		return limit
	}
	t, _ := eem.FindTest(code)
	return t.Limit
}

// String names the line: "Rayleigh, order 1", "Raman 3400 cm⁻¹, order 2".
func (l Line) String() string {
	if l.Shift == 0 {
		return fmt.Sprintf("Rayleigh, order %d", l.Order)
	}
	return fmt.Sprintf("Raman %g cm⁻¹, order %d", l.Shift, l.Order)
}

// CheckWavelength appends to e where the ridges of line l lie against where they
// should, and flags an offset (test wavelength) when it exceeds limit nm by more
// than three standard uncertainties; limit 0 means the test's default. Data are
// never shifted. The first Rayleigh line tells of emission against excitation
// axis; blanks show it best. What a ridge's window holds is told at Ridge.
func CheckWavelength(e *eem.EEM, l Line, window, limit float64) *eem.EEM {
	out := e.Clone()
	limit = defaultLimit("wavelength", limit)
	s, ok := Offset(Ridge(e, l, window))
	if !ok {
		out.Note(eem.Note{Step: Step, Msg: fmt.Sprintf("%s: a ridge at %d excitations, too few to check the wavelengths", l, s.N)})
		return out
	}
	out.Note(eem.Note{Step: Step, Msg: fmt.Sprintf("%s: ridge %+.2f nm off its line at %d excitations, %.1f nm wide", l, s.NM, s.N, s.Width),
		Params: []eem.Param{
			{Name: l.String() + ", offset", Value: num(s.NM), Unit: "nm", Source: "ridge"},
			{Name: l.String() + ", offset, standard uncertainty", Value: num(s.U), Unit: "nm", Source: "ridge"},
			{Name: l.String() + ", width", Value: num(s.Width), Unit: "nm", Source: "ridge"}}})
	if math.Abs(s.NM) > limit+3*s.U {
		out.Note(finding("wavelength", s.NM, limit, fmt.Sprintf(
			"the ridge of %s lies %+.2f nm (± %.2f) off its line at %d excitations; check the monochromators with a line lamp before trusting peak positions", l, s.NM, 2*s.U, s.N)))
	}
	return out
}

// AutoBand gives a line the band that its own ridges need: out to where a
// Gaussian of the upper quartile of their widths, as high as their median height
// stands in the noise, falls to one standard deviation of the noise,
//
//	d = (W/2)·√(log₂ S),
//
// moved by the ridges' offset, and rounded up to half nanometres. Real slits
// have longer tails than a Gaussian, so that d is at least one width. ok is
// false where fewer than three excitations show the line.
func AutoBand(ps []Peak, l Line, why eem.Reason) (b Band, ok bool) {
	s, ok := Offset(ps)
	if !ok {
		return Band{}, false
	}
	w, snr := make([]float64, len(ps)), make([]float64, len(ps))
	for i, p := range ps {
		w[i], snr[i] = p.Width, min(p.Snr, 1e6)
	}
	wide := quantile(w, 0.75)
	d := max(wide, wide/2*math.Sqrt(math.Log2(median(snr))))
	up := func(v float64) float64 { return max(0.5, math.Ceil(2*v)/2) }
	return Band{Line: l, Below: up(d - s.NM), Above: up(d + s.NM), Reason: why}, true
}

// Seen tells how strong line l is in e against a blank: the factor r of the least
// squares fit, scan by scan over window nm on both sides of the line,
//
//	F_e(em) = r·F_blank(em) + a quadratic in em,
//
// where the quadratic takes the fluorescence, joined over the excitations by
// 1/u². u, its standard uncertainty, grows when the excitations disagree. Compare
// after the inner filter was corrected and before the blank is subtracted: r is
// then 1 for a bottle that got the light its blanks got. ok is false where fewer
// than three excitations can be compared or u is above 0.25, so that nothing can
// be said. It panics when the grids differ.
func Seen(e, blank *eem.EEM, l Line, window float64) (r, u float64, ok bool) {
	if !e.Grid.Equal(blank.Grid) {
		panic(fmt.Sprintf("scatter: %s against a blank on %s", e.Grid, blank.Grid))
	}
	var rs, ws []float64
	sw, swr := 0.0, 0.0
	for j := range e.Ex.Len() {
		v, se, ok := seenAt(e, blank, j, l.Em(e.Ex.At(j)), window)
		if !ok {
			continue
		}
		w := 1 / (se * se)
		rs, ws = append(rs, v), append(ws, w)
		sw, swr = sw+w, swr+w*v
	}
	if len(rs) < 3 {
		return 0, 0, false
	}
	r = swr / sw
	chi2 := 0.0
	for i, v := range rs {
		chi2 += ws[i] * (v - r) * (v - r)
	}
	u = math.Sqrt(max(1, chi2/float64(len(rs)-1)) / sw)
	return r, u, u <= 0.25
}

// seenAt fits one scan.
func seenAt(e, blank *eem.EEM, j int, at, window float64) (r, u float64, ok bool) {
	x, y, ok1 := stretch(e, j, at-window, at+window)
	_, b, ok2 := stretch(blank, j, at-window, at+window)
	n := len(x)
	if !ok1 || !ok2 || n < 8 {
		return 0, 0, false
	}
	scale := max(math.Abs(slices.Max(b)), math.Abs(slices.Min(b))) // columns of like size
	if scale == 0 {
		return 0, 0, false
	}
	a := mat.NewDense(n, 4, nil)
	for i, v := range x {
		t := (v - at) / window
		a.SetRow(i, []float64{b[i] / scale, 1, t, t * t})
	}
	r, u, ok = firstCoefficient(a, y)
	return r / scale, u / scale, ok && u > 0
}

// firstCoefficient solves min ‖a·c − y‖ and returns c₁ with its standard
// uncertainty from the residuals. The first diagonal element of (aᵀa)⁻¹ is the
// squared norm of the first row of R⁻¹.
func firstCoefficient(a *mat.Dense, y []float64) (c1, u float64, ok bool) {
	n, p := a.Dims()
	var qr mat.QR
	qr.Factorize(a)
	if !(qr.Cond() <= 1e10) { // the first column is a parabola itself: no line
		return 0, 0, false
	}
	var c, fit mat.VecDense
	if err := qr.SolveVecTo(&c, false, mat.NewVecDense(n, y)); err != nil {
		return 0, 0, false
	}
	fit.MulVec(a, &c)
	ss := 0.0
	for i, v := range y {
		ss += (v - fit.AtVec(i)) * (v - fit.AtVec(i))
	}
	var r mat.Dense
	qr.RTo(&r)
	tri := mat.NewTriDense(p, mat.Upper, nil)
	for i := range p {
		for k := i; k < p; k++ {
			tri.SetTri(i, k, r.At(i, k))
		}
	}
	var inv mat.TriDense
	if err := inv.InverseTri(tri); err != nil {
		return 0, 0, false
	}
	q := 0.0
	for k := range p {
		q += inv.At(0, k) * inv.At(0, k)
	}
	return c.AtVec(0), math.Sqrt(q * ss / float64(n-p)), true
}

// CheckLight appends to e how strong its own line is against its blank's (Seen)
// and flags the bottle: no-light where it is below a tenth beyond doubt, low-light
// where it is below limit (0 means the test's default). Strong fluorescence that
// hides the line gives no verdict.
func CheckLight(e, blank *eem.EEM, l Line, window, limit float64) *eem.EEM {
	const none = 0.1
	out := e.Clone()
	limit = defaultLimit("low-light", limit)
	r, u, ok := Seen(e, blank, l, window)
	if !ok {
		out.Note(eem.Note{Step: Step, Msg: l.String() + ": cannot be compared with the blank's"})
		return out
	}
	out.Note(eem.Note{Step: Step, Msg: fmt.Sprintf("%s: %.3g of the blank's", l, r), Params: []eem.Param{
		{Name: l.String() + ", of the blank's", Value: num(r), Source: "ridge"},
		{Name: l.String() + ", of the blank's, standard uncertainty", Value: num(u), Source: "ridge"}}})
	switch {
	case r+3*u < none:
		out.Note(finding("no-light", r, none, fmt.Sprintf("water's own light (%s) is %.3g of the blank's: the bottle got no light; look for a closed shutter, an empty cell, a dead lamp, and scan again", l, r)))
	case r+2*u < limit:
		out.Note(finding("low-light", r, limit, fmt.Sprintf("water's own light (%s) is %.3g of the blank's; look for a bubble, a blocked slit, a cell that stands askew, and scan again", l, r)))
	}
	return out
}
