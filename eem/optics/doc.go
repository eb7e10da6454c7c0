// Package optics computes what the water's own colour and glow are commonly
// summed up in: absorption coefficients and slopes, fluorescence indices, peaks
// and regional shares. All fluorescence values want a corrected EEM; all of them
// interpolate linearly to the exact wavelengths and include both ends of their
// windows.
//
// An index is refused, with the reason in words, where the EEM does not cover
// its wavelengths or where more than a fifth of a window was filled and not
// measured. Indices tell of mixtures by convention; they identify nothing.
package optics

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// MaxFilled is the share of a window that may be filled instead of measured
// (common practice, no source).
const MaxFilled = 0.2

// Index is one index of one bottle.
type Index struct {
	Name    string  // column name
	Value   float64 // NaN when refused
	U       float64 // standard uncertainty from the EEM's variances and causes; NaN where it has none
	Unit    string  // empty for a ratio; the EEM's unit for a peak
	What    string  // definition in words
	Source  string
	Refused string // why there is no value
}

// Fluorescence returns the fluorescence indices of e, always the same ones in
// the same order.
func Fluorescence(e *eem.EEM) []Index {
	out := make([]Index, len(specs))
	for i, s := range specs {
		out[i] = s.index(e)
	}
	return out
}

// spec describes one fluorescence index.
type spec struct {
	name, what, source string
	peak               bool // has the unit of the EEM
	of                 quantity
}

var specs = []spec{
	{"fi_470_520", "fluorescence index, F(em 470) / F(em 520) at ex 370", "Cory & McKnight 2005, Environ. Sci. Technol. 39, 8142", false,
		ratio(point(370, 470), point(370, 520))},
	{"fi_450_500", "fluorescence index in its first form, F(em 450) / F(em 500) at ex 370, meant for uncorrected spectra", "McKnight et al. 2001, Limnol. Oceanogr. 46, 38", false,
		ratio(point(370, 450), point(370, 500))},
	{"bix", "biological index, F(em 380) / F(em 430) at ex 310", "Huguet et al. 2009, Org. Geochem. 40, 706", false,
		ratio(point(310, 380), point(310, 430))},
	{"hix_sum", "humification index, H / (H + L), H sum over em 435–480 and L over 300–345 in 1 nm steps, ex 254", "Ohno 2002, Environ. Sci. Technol. 36, 742", false,
		part(window(254, 435, 480), window(254, 300, 345))},
	{"hix_ratio", "humification index in its first form, H / L, same sums", "Zsolnay et al. 1999, Chemosphere 38, 45", false,
		ratio(window(254, 435, 480), window(254, 300, 345))},
	{"freshness", "β/α, F(em 380) / max F(em 420–435) at ex 310", "Wilson & Xenopoulos 2009, Nat. Geosci. 2, 37", false,
		ratio(point(310, 380), highest(310, 310, 420, 435))},
	{"freshness_boxes", "β/α, max F(ex 310–320, em 380–420) / max F(ex 330–350, em 420–480)", "Parlanti et al. 2000, Org. Geochem. 31, 1765", false,
		ratio(highest(310, 320, 380, 420), highest(330, 350, 420, 480))},
	{"peak_b", "tyrosine-like peak B, F(ex 275, em 310)", coble, true, point(275, 310)},
	{"peak_t", "tryptophan-like peak T, F(ex 275, em 340)", coble, true, point(275, 340)},
	{"peak_a", "humic-like peak A, max F(em 380–460) at ex 260", coble, true, highest(260, 260, 380, 460)},
	{"peak_m", "humic-like peak M, max F(em 380–420) at ex 312", coble, true, highest(312, 312, 380, 420)},
	{"peak_c", "humic-like peak C, max F(em 420–480) at ex 350", coble, true, highest(350, 350, 420, 480)},
}

const coble = "Coble 1996, Mar. Chem. 51, 325 (from memory)"

func (s spec) index(e *eem.EEM) Index {
	ix := Index{Name: s.name, What: s.what, Source: s.source, Value: math.NaN(), U: math.NaN()}
	if s.peak {
		ix.Unit = string(e.Unit)
	}
	v := s.of(e)
	if ix.Refused = v.refused; ix.Refused != "" {
		return ix
	}
	ix.Value, ix.U = v.v, v.uncertainty(e)
	return settled(ix)
}

// settled sees to it that an index has a number or a reason, not both.
func settled(ix Index) Index {
	if ix.Refused == "" && (math.IsNaN(ix.Value) || math.IsInf(ix.Value, 0)) {
		ix.Refused = fmt.Sprintf("it comes out as %g", ix.Value)
	}
	if ix.Refused != "" {
		ix.Value, ix.U = math.NaN(), math.NaN()
	}
	return ix
}

// Flat returns name → value of the indices that were not refused.
func Flat(list []Index) map[string]float64 {
	m := make(map[string]float64, len(list))
	for _, ix := range list {
		if ix.Refused == "" {
			m[ix.Name] = ix.Value
		}
	}
	return m
}

// Note tells which indices were refused, or nothing.
func Note(list []Index) (eem.Note, bool) {
	n := eem.Note{Step: "optics"}
	for _, ix := range list {
		if ix.Refused != "" {
			n.Params = append(n.Params, eem.Param{Name: ix.Name, Value: "refused", Source: ix.Refused})
		}
	}
	n.Msg = fmt.Sprintf("%d of %d indices refused", len(n.Params), len(list))
	return n, len(n.Params) > 0
}
