package scanfile

import (
	"bytes"
	"math"
	"regexp"
	"strings"

	"tarnlight/eem"
)

// largestAbsorbance is above what any spectrophotometer reports; a column with
// more holds transmission, a coefficient or intensities.
const largestAbsorbance = 20

var (
	coefficientWord = regexp.MustCompile(`(?i)coeff?icient|koeffizient|(?:^|[^c])(?:1/m|m-1|m\^-1|m⁻¹)(?:[^a-z]|$)`)
	milliWord       = regexp.MustCompile(`(?:^|[^\p{L}])mAU?(?:[^\p{L}]|$)`)
)

// ReadAbsorbanceBytes is ReadAbsorbance on bytes.
func ReadAbsorbanceBytes(name string, data []byte, s *Settings) (*eem.Absorbance, []eem.Note, error) {
	r, err := open(name, data, s)
	if err != nil {
		return nil, nil, err
	}
	r.how = "an absorbance spectrum"
	if isJCAMP(r.text) {
		return r.jcampAbsorbance()
	}
	b, cols, err := r.spectrum("absorbance")
	if err != nil {
		return nil, nil, err
	}
	c, err := r.absorbanceColumn(b, cols)
	if err != nil {
		return nil, nil, err
	}
	a := r.col(b, c, 0)
	for i, v := range a {
		if v > largestAbsorbance {
			return nil, nil, errorf(name, r.line(b, i), "absorbance %g; no instrument measures that, so the column holds something else (transmission, a coefficient): give decadic absorbance", v)
		}
	}
	axis, o, err := r.wavelengths(b)
	if err != nil {
		return nil, nil, err
	}
	r.notes()
	return &eem.Absorbance{Axis: axis, A: o.apply(a), PathCM: 1}, r.file.Notes, nil
}

// spectrum cuts a file that holds one table of wavelengths and values.
func (r *reader) spectrum(what string) (*block, int, error) {
	if err := r.cut(); err != nil {
		return nil, 0, err
	}
	if err := r.mainBlocks(); err != nil {
		return nil, 0, err
	}
	switch len(r.main) {
	case 0:
		return nil, 0, errorf(r.name, 0, "holds no rows of numbers; an %s file has two columns, wavelength and %s", what, what)
	case 1:
	default:
		return nil, 0, errorf(r.name, r.main[1].first, "a second table of numbers; keep one spectrum a file")
	}
	b := &r.main[0]
	r.over = b.over
	cols := r.usedCols(b)
	if cols < 2 {
		return nil, 0, errorf(r.name, b.first, "one column of numbers; an %s file has two, wavelength and %s: set scans.delimiter and scans.decimal", what, what)
	}
	return b, cols, nil
}

// wavelengths makes the axis of a spectrum of its first column.
func (r *reader) wavelengths(b *block) (eem.Axis, order, error) {
	nm := r.col(b, 0, 0)
	r.toNM(nm, r.saysWavenumber(b, 0))
	return r.axis(nm, func(i int) int { return r.line(b, i) })
}

// absorbanceColumn finds the column of absorbances: the second of two, or of more
// the one that is named so. A header that names another quantity is an error.
func (r *reader) absorbanceColumn(b *block, cols int) (int, error) {
	for t := range b.headers {
		f := r.header(t)
		if len(f) < 2 || len(f) > b.cols {
			continue
		}
		var named []int
		for i, cell := range f[1:] {
			if k, _ := roleOf(cell); k == absorbanceRole {
				named = append(named, i+1)
			}
		}
		c := 1
		switch {
		case len(named) == 1:
			c = named[0]
		case len(named) > 1:
			return 0, errorf(r.name, t.no, "%d columns are named as absorbance (%s); keep one of them", len(named), clip(bytes.Join(f[1:], []byte(", "))))
		case cols > 2:
			continue
		}
		if k, _ := roleOf(f[c]); k == percentRole {
			return 0, errorf(r.name, t.no, "%q is no absorbance; export decadic absorbance (A = −log10 of the transmission)", clip(f[c]))
		}
		if coefficientWord.Match(f[c]) {
			return 0, errorf(r.name, t.no, "%q is an absorption coefficient; give the decadic absorbance of the cell (a = 2.303·A/path)", clip(f[c]))
		}
		if milliWord.Match(f[c]) {
			return 0, errorf(r.name, t.no, "%q is a thousandth of an absorbance; divide the column by 1000 and name it absorbance", clip(f[c]))
		}
		if c < cols {
			return c, nil
		}
	}
	if cols > 2 {
		return 0, errorf(r.name, b.first, "%d columns beside the wavelength; keep one, or name one of them absorbance", cols-1)
	}
	return 1, nil
}

// ReadFactorsBytes is ReadFactors on bytes.
func ReadFactorsBytes(name string, data []byte, s *Settings) (*Factors, []eem.Note, error) {
	r, err := open(name, data, s)
	if err != nil {
		return nil, nil, err
	}
	r.how = "spectral factors"
	b, cols, err := r.spectrum("factor")
	if err != nil {
		return nil, nil, err
	}
	if cols > 3 {
		return nil, nil, errorf(name, b.first, "%d columns; a factor file has wavelength_nm, factor and perhaps standard_uncertainty", cols)
	}
	factor := r.col(b, 1, 0)
	for i, v := range factor {
		if !(v > 0) {
			return nil, nil, errorf(name, r.line(b, i), "factor %s; a factor is a number above 0: leave out the wavelengths that have none", numberOrBlank(v))
		}
	}
	axis, o, err := r.wavelengths(b)
	if err != nil {
		return nil, nil, err
	}
	f := &Factors{Axis: axis, Factor: o.apply(factor)}
	if cols == 3 {
		u := r.col(b, 2, 0)
		for i, v := range u {
			if !(v >= 0) {
				return nil, nil, errorf(name, r.line(b, i), "standard uncertainty %s; give 0 or more for every factor, or leave the column out", numberOrBlank(v))
			}
		}
		f.U = o.apply(u)
	}
	r.notes()
	return f, r.file.Notes, nil
}

func numberOrBlank(v float64) string {
	if math.IsNaN(v) {
		return "is missing"
	}
	return strings.TrimSpace(formatNumber(v))
}
