package scanfile

import (
	"bytes"
	"math"
	"regexp"
	"strings"

	"tarnlight/eem"
)

// Curve is a spectrum in whatever unit it comes: a lamp, a reference material, a
// certificate.
type Curve struct {
	Axis eem.Axis
	Y    []float64 // finite, same length as Axis
	U    []float64 // standard uncertainty, ≥ 0; nil where the file has none
}

// uncertaintyWord names a column of standard uncertainties.
var uncertaintyWord = regexp.MustCompile(`(?i)uncertaint|unsicherheit|incertitude|incertidumbre|^"?u(?:\(.*\))?"?$`)

// ReadCurve reads a spectrum as an instrument exports it or a certificate gives it:
// two columns with any header and footer, JCAMP-DX, or the first sheet of a workbook.
// Of more columns the one named intensity (counts, signal …) is taken, or the second
// where the third is named as its standard uncertainty or nothing is named.
func ReadCurve(path string, s *Settings) (*Curve, []eem.Note, error) {
	data, err := Load(path)
	if err != nil {
		return nil, nil, err
	}
	return ReadCurveBytes(path, data, s)
}

// ReadCurveBytes is ReadCurve on bytes.
func ReadCurveBytes(name string, data []byte, s *Settings) (*Curve, []eem.Note, error) {
	if bytes.HasPrefix(data, []byte("PK\x03\x04")) {
		text, err := bookText(name, data)
		if err != nil {
			return nil, nil, err
		}
		data = text
	}
	r, err := open(name, data, s)
	if err != nil {
		return nil, nil, err
	}
	r.how = "a spectrum"
	if isJCAMP(r.text) {
		return r.jcampCurve()
	}
	b, cols, err := r.spectrum("intensity")
	if err != nil {
		return nil, nil, err
	}
	y, u, err := r.curveColumns(b, cols)
	if err != nil {
		return nil, nil, err
	}
	axis, o, err := r.wavelengths(b)
	if err != nil {
		return nil, nil, err
	}
	c := &Curve{Axis: axis}
	if c.Y, err = r.finite(b, y, math.Inf(-1)); err != nil {
		return nil, nil, err
	}
	c.Y = o.apply(c.Y)
	if u > 0 {
		if c.U, err = r.finite(b, u, 0); err != nil {
			return nil, nil, err
		}
		c.U = o.apply(c.U)
	}
	r.notes()
	return c, r.file.Notes, nil
}

// finite copies column c, in which every cell must be a number of least or more.
func (r *reader) finite(b *block, c int, least float64) ([]float64, error) {
	v := r.col(b, c, 0)
	for i, x := range v {
		switch {
		case math.IsNaN(x) || math.IsInf(x, 0):
			return nil, errorf(r.name, r.line(b, i), "column %d has no number; leave the row out, or the column", c+1)
		case x < least:
			return nil, errorf(r.name, r.line(b, i), "a standard uncertainty of %g; write 0 or more", x)
		}
	}
	return v, nil
}

// curveColumns finds the columns of values and of their uncertainty, 0 for none.
func (r *reader) curveColumns(b *block, cols int) (y, u int, err error) {
	y = 1
	if cols == 2 {
		return y, 0, nil
	}
	for t := range b.headers {
		f := r.header(t)
		if len(f) < 2 || len(f) > b.cols {
			continue
		}
		named := 0
		for i, cell := range f[1:] {
			switch k, _ := roleOf(cell); {
			case uncertaintyWord.Match(bytes.TrimSpace(cell)):
				u = i + 1
			case k == intensityRole:
				y = i + 1
				named++
			}
		}
		if named == 1 || named == 0 && u > 1 && cols == 3 {
			return y, u, nil
		}
		return 0, 0, errorf(r.name, t.no, "%d columns beside the wavelength (%s); keep one, or name one of them intensity and one standard_uncertainty", cols-1, clip(bytes.Join(f[1:], []byte(", "))))
	}
	if cols == 3 {
		return 1, 2, nil
	}
	return 0, 0, errorf(r.name, b.first, "%d columns beside the wavelength; keep one, or name one of them intensity", cols-1)
}

// jcampCurve reads the one block of a JCAMP-DX file.
func (r *reader) jcampCurve() (*Curve, []eem.Note, error) {
	blocks, err := r.jcampBlocks()
	if err != nil {
		return nil, nil, err
	}
	b := blocks[0]
	if len(blocks) > 1 {
		return nil, nil, errorf(r.name, blocks[1].line, "a second spectrum; keep one spectrum a file")
	}
	points := 0
	x, y, err := r.jcampTable(b, &points)
	if err != nil {
		return nil, nil, err
	}
	axis, o, err := r.axis(x, func(int) int { return b.at + 1 })
	if err != nil {
		return nil, nil, err
	}
	y = o.apply(y)
	for i, v := range y {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, nil, errorf(r.name, b.at, "no value at %g nm; export the spectrum without gaps", axis.At(i))
		}
	}
	r.notes()
	return &Curve{Axis: axis, Y: y}, r.file.Notes, nil
}

// bookText is the first sheet of a workbook as tab-delimited text, row for row.
func bookText(name string, data []byte) ([]byte, error) {
	t, err := ReadTableBytes(name, data)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	line := 1
	put := func(at int, cells []string) {
		for ; line < at; line++ {
			b.WriteByte('\n')
		}
		b.WriteString(strings.NewReplacer("\n", " ", "\r", " ").Replace(strings.Join(cells, "\t")))
	}
	put(t.HeadLine, t.Header)
	for _, r := range t.Rows {
		put(r.Line, r.Cells)
	}
	b.WriteByte('\n')
	return b.Bytes(), nil
}
