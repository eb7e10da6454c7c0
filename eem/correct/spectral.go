package correct

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/interp"

	"tarnlight/eem"
)

// Factors is a spectral correction: at each wavelength the number by which an
// intensity is multiplied. Only the shape over wavelength matters; the scale is
// taken out by the intensity unit.
type Factors struct {
	Axis   eem.Axis
	Factor []float64 // > 0, same length as Axis
	U      []float64 // standard uncertainty of Factor, same length; nil where nobody knows it
	Source string    // file or certificate, for the notes
}

// NewFactors checks and copies a table of factors. u may be nil. Errors name the
// wavelength at fault.
func NewFactors(nm, factor, u []float64, source string) (*Factors, error) {
	if len(factor) != len(nm) || (u != nil && len(u) != len(nm)) {
		return nil, errors.New("a factor table needs one factor, and one uncertainty or none, for every wavelength")
	}
	ax, err := eem.NewAxis(nm)
	if err != nil {
		return nil, err
	}
	for i, v := range factor {
		if !(v > 0) || math.IsInf(v, 0) {
			return nil, fmt.Errorf("factor %g at %g nm; factors must be positive numbers", v, nm[i])
		}
		if u != nil && (!(u[i] >= 0) || math.IsInf(u[i], 0)) {
			return nil, fmt.Errorf("uncertainty %g of the factor at %g nm; it must be 0 or more", u[i], nm[i])
		}
	}
	return &Factors{Axis: ax, Factor: slices.Clone(factor), U: slices.Clone(u), Source: source}, nil
}

// On returns factor and relative standard uncertainty at every point of ax:
// shape-preserving piecewise cubic (Fritsch & Butland 1984, SIAM J. Sci. Stat.
// Comput. 5, 300) for the factor, linear for its uncertainty; NaN outside the
// table, never extrapolated.
func (f *Factors) On(ax eem.Axis) (factor, rel []float64) {
	factor, rel = make([]float64, ax.Len()), make([]float64, ax.Len())
	var fb interp.FritschButland
	if f.Axis.Len() > 1 {
		_ = fb.Fit(f.Axis.Values(), f.Factor) // always nil; panics only on what NewFactors rejects
	}
	for i := range ax.Len() {
		nm := ax.At(i)
		factor[i], rel[i] = math.NaN(), math.NaN()
		if !f.Axis.Covers(nm) {
			continue
		}
		if at, ok := f.Axis.Find(nm); ok {
			factor[i] = f.Factor[at]
		} else {
			factor[i] = fb.Predict(nm)
		}
		rel[i] = 0
		if f.U != nil {
			rel[i] = f.Axis.Interp(f.U, nm) / factor[i]
		}
	}
	return factor, rel
}

// Spectral multiplies every cell by the excitation and the emission factor at
// its wavelengths; nil leaves one out. Cells outside a table become missing
// (Uncorrected). A table with uncertainties brings one cause of the survey for
// its axis: the error of a factor is the same in every bottle and does not
// average out, and how it is shared among wavelengths no certificate tells, so
// that all are taken to be off together.
func Spectral(e *eem.EEM, ex, em *Factors) *eem.EEM {
	if ex == nil && em == nil {
		return e.Clone()
	}
	out := own(e)
	fx, ux := onAxis(ex, e.Ex)
	fm, um := onAxis(em, e.Em)
	lost := 0
	for j := range fx {
		for k := range fm {
			i, f := e.Index(j, k), fx[j]*fm[k]
			if !math.IsNaN(f) && !math.IsInf(f, 0) {
				times(out, i, f)
				continue
			}
			if measured(e, i) {
				lost++
			}
			if e.Why[i] == eem.Measured {
				out.Drop(i, eem.Uncorrected)
			}
		}
	}
	addCause(out, "excitation factors", ex, func(j, _ int) float64 { return ux[j] })
	addCause(out, "emission factors", em, func(_, k int) float64 { return um[k] })
	out.Note(record(StepSpectral, "multiplied by the factor at each excitation and emission", append(ex.params("excitation"), em.params("emission")...)...))
	if lost > 0 {
		out.Note(finding(StepSpectral, "factor-range", float64(lost), 0, fmt.Sprintf(
			"%s left out: outside the spectral factors (%s); bring factors for ex %s and em %s",
			eem.Count(lost, "cell"), strings.Join(append(ex.short(e.Ex), em.short(e.Em)...), ", "), stretch(e.Ex), stretch(e.Em))))
	}
	return out
}

// short names the table and what it covers, when that is less than ax.
func (f *Factors) short(ax eem.Axis) []string {
	if f == nil || f.Axis.Covers(ax.First()) && f.Axis.Covers(ax.Last()) {
		return nil
	}
	return []string{fmt.Sprintf("%s: %s", f.Source, f.Axis)}
}

// onAxis gives factors and relative uncertainties on ax, ones and zeros for nil.
func onAxis(f *Factors, ax eem.Axis) (factor, rel []float64) {
	if f != nil {
		return f.On(ax)
	}
	factor = make([]float64, ax.Len())
	for i := range factor {
		factor[i] = 1
	}
	return factor, make([]float64, ax.Len())
}

// addCause appends the cause of one factor table; rel is the relative
// uncertainty at cell (j, k).
func addCause(e *eem.EEM, name string, f *Factors, rel func(j, k int) float64) {
	if f == nil || f.U == nil {
		return
	}
	s := make([]float64, len(e.F))
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			i := e.Index(j, k)
			s[i] = e.F[i] * rel(j, k)
		}
	}
	e.Causes = append(e.Causes, eem.Cause{Name: name, Scope: eem.OfSurvey, Key: f.Source, Shape: s})
}

// params describes the table in a note.
func (f *Factors) params(axis string) []eem.Param {
	if f == nil {
		return nil
	}
	return []eem.Param{{Name: axis + " factors", Value: fmt.Sprintf("%g–%g", f.Axis.First(), f.Axis.Last()), Unit: "nm", Source: f.Source}}
}
