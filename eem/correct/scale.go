package correct

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"tarnlight/eem"
)

// Baselines under the Raman line.
const (
	NoBaseline       = "none"
	StraightBaseline = "straight" // a line between the ends of the window
)

// RamanArea is the area of water's Raman line over the blanks of a batch.
type RamanArea struct {
	Area   float64    // mean, intensity · nm
	U      float64    // standard uncertainty of Area from the blanks' scatter; NaN with fewer than two
	N      int        // how many blanks
	ExNM   float64    // nm
	Window [2]float64 // nm
	Base   string     // NoBaseline or StraightBaseline
	From   string     // where the blanks come from; empty means the batch itself
}

// Area integrates the blank's emission at exNM over window (both nm) by the
// trapezoid rule, with the ends of the window interpolated: the Raman area of
// Lawaetz & Stedmon 2009, Appl. Spectrosc. 63, 936 (ex 350, 371–428 nm; from
// memory), intensity · nm, of a spectrally corrected blank. An excitation
// between two measured ones is interpolated. The error says which wavelengths
// are missing.
func Area(blank *eem.EEM, exNM float64, window [2]float64, baseline string) (float64, error) {
	if baseline != "" && baseline != NoBaseline && baseline != StraightBaseline {
		return 0, fmt.Errorf("baseline %q is unknown; use %s or %s", baseline, NoBaseline, StraightBaseline)
	}
	if !(window[0] < window[1]) {
		return 0, fmt.Errorf("the Raman window %g–%g nm is empty", window[0], window[1])
	}
	if !blank.Ex.Covers(exNM) {
		return 0, fmt.Errorf("the blank was not excited at %g nm (it has %s)", exNM, blank.Ex)
	}
	x := []float64{window[0]}
	for k := range blank.Em.Len() {
		if v := blank.Em.At(k); v > window[0] && v < window[1] {
			x = append(x, v)
		}
	}
	x = append(x, window[1])
	y := make([]float64, len(x))
	for n, em := range x {
		y[n] = blank.Interp(exNM, em)
	}
	if gaps := missing(x, y); gaps != "" {
		return 0, fmt.Errorf("the blank lacks em %s nm of the Raman window %g–%g nm at ex %g nm (its emission is %s)", gaps, window[0], window[1], exNM, blank.Em)
	}
	area := trapezoid(x, y)
	if baseline == StraightBaseline {
		area -= (y[0] + y[len(y)-1]) / 2 * (window[1] - window[0])
	}
	return area, nil
}

// trapezoid integrates y over x. (gonum's integrate.Trapezoidal panics on two
// equal points, which a window end beside a grid point can give.)
func trapezoid(x, y []float64) float64 {
	sum := 0.0
	for i := 1; i < len(x); i++ {
		sum += (x[i] - x[i-1]) * (y[i] + y[i-1]) / 2
	}
	return sum
}

// missing lists the runs of x where y is NaN.
func missing(x, y []float64) string {
	var runs []string
	for i := 0; i < len(x); i++ {
		if !math.IsNaN(y[i]) {
			continue
		}
		from := i
		for i+1 < len(x) && math.IsNaN(y[i+1]) {
			i++
		}
		if from == i {
			runs = append(runs, fmt.Sprintf("%g", x[i]))
		} else {
			runs = append(runs, fmt.Sprintf("%g–%g", x[from], x[i]))
		}
	}
	return strings.Join(runs, ", ")
}

// Areas averages Area over the blanks of a batch. Every blank must have the
// line, and the mean must be positive.
func Areas(blanks []*eem.EEM, exNM float64, window [2]float64, baseline string) (RamanArea, error) {
	if len(blanks) == 0 {
		return RamanArea{}, errors.New("no blank to take the Raman area from")
	}
	if baseline == "" {
		baseline = NoBaseline
	}
	r := RamanArea{N: len(blanks), ExNM: exNM, Window: window, Base: baseline, U: math.NaN()}
	areas := make([]float64, len(blanks))
	for i, b := range blanks {
		a, err := Area(b, exNM, window, baseline)
		if err != nil {
			return RamanArea{}, err
		}
		areas[i] = a
		r.Area += a / float64(len(blanks))
	}
	if !usable(r.Area) {
		return RamanArea{}, fmt.Errorf("the Raman area at ex %g nm is %s; a blank with light in it has a positive one", exNM, num(r.Area))
	}
	if n := float64(len(blanks)); n > 1 {
		ss := 0.0
		for _, a := range areas {
			ss += (a - r.Area) * (a - r.Area)
		}
		r.U = math.Sqrt(ss / (n - 1) / n)
	}
	return r, nil
}

// usable says whether one can divide by v: it is positive and neither it nor its
// inverse beyond what a float64 holds.
func usable(v float64) bool { return v > 0 && !math.IsInf(v, 0) && !math.IsInf(1/v, 0) }

// RamanUnits divides e by the Raman area: intensities in Raman units, nm⁻¹. A
// known uncertainty of the area becomes the cause "intensity scale" of the batch.
// It panics on an area that is not positive; Areas gives none.
func RamanUnits(e *eem.EEM, r RamanArea, batch string) *eem.EEM {
	from := "blanks of the batch"
	if r.From != "" {
		from = "borrowed blanks: " + r.From
	}
	out := Scale(e, 1/r.Area, eem.Raman, record(StepScale, "divided by the area of water's Raman line",
		eem.Param{Name: "Raman area", Value: num(r.Area), Unit: "counts nm", Source: from},
		eem.Param{Name: "blanks", Value: fmt.Sprint(r.N), Source: "run sheet"},
		eem.Param{Name: "excitation", Value: num(r.ExNM), Unit: "nm", Source: "settings: intensity.excitation_nm"},
		eem.Param{Name: "window", Value: fmt.Sprintf("%g–%g", r.Window[0], r.Window[1]), Unit: "nm", Source: "settings: intensity.window_nm"},
		eem.Param{Name: "baseline", Value: r.Base, Source: "settings: intensity.baseline"}))
	if r.U > 0 {
		out.Causes = append(out.Causes, eem.Cause{Name: StepScale, Scope: eem.OfBatch, Key: batch, U: r.U / r.Area})
	}
	return out
}

// Scale multiplies e by f (> 0), calls the result unit and appends note. It panics
// on another f.
func Scale(e *eem.EEM, f float64, unit eem.Unit, note eem.Note) *eem.EEM {
	if !(f > 0) || math.IsInf(f, 0) {
		panic(fmt.Sprintf("correct: scale %g", f))
	}
	out := own(e)
	for i := range out.F {
		times(out, i, f)
	}
	out.Unit = unit
	out.Note(note)
	return out
}

// Dilute multiplies e by the dilution factor d, final volume over sample volume,
// so that it tells of the bottle and not of the liquid scanned. It panics when
// d is below 1.
func Dilute(e *eem.EEM, d float64) *eem.EEM {
	if !(d >= 1) || math.IsInf(d, 0) {
		panic(fmt.Sprintf("correct: dilution %g", d))
	}
	out := Scale(e, d, e.Unit, record(StepDilution, "multiplied by "+num(d),
		eem.Param{Name: "dilution", Value: num(d), Source: "run sheet: dilution"}))
	if d > 1 {
		out.Note(finding(StepDilution, "diluted", d, 1, "the result was multiplied by the dilution factor "+num(d)))
	}
	return out
}
