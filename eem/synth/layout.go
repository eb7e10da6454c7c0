package synth

import (
	"bytes"
	"strconv"
	"strings"

	"tarnlight/eem"
)

// Form is how a bottle's scans lie in files.
type Form int

// The forms.
const (
	Stack  Form = iota // a folder, one file an excitation, which the file name tells
	Matrix             // one file, first row excitations, first column emissions
	Long               // one file, three columns
)

// Layout is how raw numbers are written. The zero Layout is tab-separated stacks
// with decimal point.
type Layout struct {
	Form         Form
	Delimiter    string // zero means a tab
	DecimalComma bool
	CRLF         bool
}

// File is a file of a survey folder.
type File struct {
	Path string // with slashes
	Data []byte
}

// path returns the cell of the run sheet: the folder or file of a bottle.
func (l Layout) path(id string) string {
	switch l.Form {
	case Stack:
		return "scans/" + id
	case Matrix:
		return "scans/" + id + ".csv"
	}
	return "scans/" + id + ".txt"
}

// files writes an EEM of raw counts.
func (l Layout) files(id string, e *eem.EEM) []File {
	switch l.Form {
	case Stack:
		out := make([]File, e.Ex.Len())
		for j := range out {
			ex := strconv.FormatFloat(e.Ex.At(j), 'f', -1, 64)
			w := l.writer(16 * e.Em.Len())
			w.raw("# bottle " + id)
			w.row("emission_nm", "counts")
			for k, v := range e.Row(j) {
				w.row(w.number(e.Em.At(k), -1), w.number(v, 1))
			}
			out[j] = File{l.path(id) + "/" + id + "_ex" + ex + ".txt", w.Bytes()}
		}
		return out
	case Matrix:
		w := l.writer(9 * e.Cells())
		cells := make([]string, 1, e.Ex.Len()+1)
		cells[0] = "em_nm/ex_nm"
		for j := range e.Ex.Len() {
			cells = append(cells, w.number(e.Ex.At(j), -1))
		}
		w.row(cells...)
		for k := range e.Em.Len() {
			cells = append(cells[:0], w.number(e.Em.At(k), -1))
			for j := range e.Ex.Len() {
				cells = append(cells, w.number(e.At(j, k), 1))
			}
			w.row(cells...)
		}
		return []File{{l.path(id), w.Bytes()}}
	}
	w := l.writer(20 * e.Cells())
	w.row("excitation_nm", "emission_nm", "counts")
	for j := range e.Ex.Len() {
		for k, v := range e.Row(j) {
			w.row(w.number(e.Ex.At(j), -1), w.number(e.Em.At(k), -1), w.number(v, 1))
		}
	}
	return []File{{l.path(id), w.Bytes()}}
}

// spectrum writes two columns; absorbance and factor files are of this kind.
func (l Layout) spectrum(name string, a eem.Axis, v []float64, digits int) []byte {
	w := l.writer(16 * a.Len())
	w.row("wavelength_nm", name)
	for i, x := range v {
		w.row(w.number(a.At(i), -1), w.number(x, digits))
	}
	return w.Bytes()
}

type writer struct {
	bytes.Buffer
	Layout
}

func (l Layout) writer(size int) *writer {
	if l.Delimiter == "" {
		l.Delimiter = "\t"
	}
	w := &writer{Layout: l}
	w.Grow(size)
	return w
}

func (w *writer) raw(line string) {
	w.WriteString(line)
	if w.CRLF {
		w.WriteByte('\r')
	}
	w.WriteByte('\n')
}

func (w *writer) row(cells ...string) { w.raw(strings.Join(cells, w.Delimiter)) }

func (w *writer) number(v float64, digits int) string {
	s := strconv.FormatFloat(v, 'f', digits, 64)
	if w.DecimalComma {
		s = strings.Replace(s, ".", ",", 1)
	}
	return s
}
