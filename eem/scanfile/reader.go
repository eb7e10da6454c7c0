package scanfile

import (
	"bytes"
	"fmt"
	"strings"

	"tarnlight/eem"
)

// reader is one file on its way from bytes to scans.
type reader struct {
	name  string
	set   Settings
	pat   *Pattern // of set.Excitation, nil where that is empty
	text  []byte
	store *store
	rows  *rowReader
	main  []block // the blocks that hold scans
	file  *File

	how         string // how the form was understood, for the note
	exFrom      string // where the excitation was found
	unsorted    int    // scans
	repeated    int    // points
	over        int    // cells
	wavenumbers bool
}

// ReadBytes is Read on bytes; name stands in messages and may hold the excitation.
func ReadBytes(name string, data []byte, s *Settings) (*File, error) {
	st := stores.Get().(*store)
	defer st.release()
	return read(name, data, s, st)
}

// read reads a file with the help of a store, of which nothing is left in the
// result.
func read(name string, data []byte, s *Settings, st *store) (*File, error) {
	r, err := open(name, data, s)
	if err != nil {
		return nil, err
	}
	r.store = st
	form := r.set.Form
	if form == JCAMP || form == Auto && isJCAMP(r.text) {
		err = r.jcamp()
	} else if err = r.cut(); err == nil {
		err = r.scans(form)
	}
	if err != nil {
		return nil, err
	}
	r.notes()
	return r.file, nil
}

// open checks the settings and decodes the file.
func open(name string, data []byte, s *Settings) (*reader, error) {
	r := &reader{name: name, file: &File{Path: name}, store: new(store)}
	if s != nil {
		r.set = *s
	}
	if r.set.Form == "" {
		r.set.Form = Auto
	}
	if err := r.set.check(); err != nil {
		return nil, err
	}
	var err error
	if r.set.Excitation != "" {
		if r.pat, err = CompilePattern(r.set.Excitation); err != nil {
			return nil, fmt.Errorf("setting scans.excitation: %w", err)
		}
		if !r.pat.Has("nm") {
			return nil, fmt.Errorf("setting scans.excitation: pattern %q has no {nm}, which stands for the excitation", r.set.Excitation)
		}
	}
	if bytes.HasPrefix(data, []byte("PK\x03\x04")) {
		return nil, errorf(name, 0, "is a workbook or an archive, not a text file; save its sheet as CSV")
	}
	r.text, r.file.Encoding, err = decode(name, data)
	return r, err
}

func (s *Settings) check() error {
	switch s.Form {
	case Auto, Stack, Grid, Long, JCAMP:
	default:
		return fmt.Errorf("setting scans.form: %q; it is auto, stack, grid, long or jcamp", s.Form)
	}
	switch s.Delimiter {
	case "", ",", ";", "\t", " ":
	default:
		return fmt.Errorf("setting scans.delimiter: %q; it is a comma, a semicolon, a tab or a blank", s.Delimiter)
	}
	switch s.Decimal {
	case "", ".", ",":
	default:
		return fmt.Errorf("setting scans.decimal: %q; it is %q or %q", s.Decimal, ".", ",")
	}
	switch s.Across {
	case "", "excitation", "emission":
	default:
		return fmt.Errorf("setting scans.across: %q; it is excitation or emission", s.Across)
	}
	if s.Skip < 0 {
		return fmt.Errorf("setting scans.skip: %d; it is 0 or a number of lines", s.Skip)
	}
	return nil
}

// cut decides delimiter and decimal mark and cuts the file into blocks. Blocks of
// numbers may be none: rows that hold text are read later, by their header.
func (r *reader) cut() error {
	body := r.text
	for range r.set.Skip {
		if _, body = cutLine(body); body == nil {
			return errorf(r.name, 0, "has no more lines than scans.skip = %d leaves out; lower it", r.set.Skip)
		}
	}
	var delim, dec byte
	if r.set.Delimiter != "" {
		delim = r.set.Delimiter[0]
	} else if delim = sniffDelimiter(body); delim == 0 {
		delim = ','
	}
	if r.set.Decimal != "" {
		dec = r.set.Decimal[0]
	} else {
		var line int
		var err error
		if dec, line, err = sniffDecimal(body, delim); err != nil {
			return errorf(r.name, line+r.set.Skip, `%w; set scans.decimal to "comma" or "point"`, err)
		}
	}
	r.rows = newRowReader(r.store, delim, dec, r.set.Skip)
	if e := r.rows.read(r.text); e != nil {
		return errorf(r.name, e.line, "%s", e.msg)
	}
	r.file.Delimiter, r.file.Decimal = string(delim), string(dec)
	return nil
}

// col copies column c of a block, rows from row on.
func (r *reader) col(b *block, c, from int) []float64 {
	out := make([]float64, b.rows-from)
	for i := range out {
		out[i] = r.rows.cells[b.cell+(from+i)*b.cols+c]
	}
	return out
}

// rowCells returns row i of a block; it is part of the reader.
func (r *reader) rowCells(b *block, i int) []float64 {
	return r.rows.cells[b.cell+i*b.cols : b.cell+(i+1)*b.cols]
}

// line returns the line of row i of a block.
func (r *reader) line(b *block, i int) int { return int(r.rows.lines[b.row+i]) }

// add appends one scan; sample is empty where the file names none.
func (r *reader) add(s eem.Scan, sample string) {
	s.File = r.name
	r.file.Scans = append(r.file.Scans, s)
	if sample != "" || r.file.Samples != nil {
		for len(r.file.Samples) < len(r.file.Scans)-1 {
			r.file.Samples = append(r.file.Samples, "")
		}
		r.file.Samples = append(r.file.Samples, sample)
	}
}

var delimiterNames = map[string]string{",": "comma", ";": "semicolon", "\t": "tab", " ": "blank"}

// notes says what the file was taken for and what had to be done to it. The
// words of the first note are the same for every file taken alike.
func (r *reader) notes() {
	f := r.file
	words := []string{"taken for " + r.how}
	if r.exFrom != "" {
		words = append(words, "excitation from "+r.exFrom)
	}
	if f.Delimiter != "" {
		mark := "decimal point"
		if f.Decimal == "," {
			mark = "decimal comma"
		}
		words = append(words, delimiterNames[f.Delimiter]+"-delimited", mark)
	}
	words = append(words, f.Encoding)
	if r.wavenumbers {
		words = append(words, "wavenumbers (1/cm) converted to nm, intensities unchanged")
	}
	r.note("read-guess", eem.Remark, 0, strings.Join(words, ", "))
	if r.unsorted > 0 {
		r.note("unsorted", eem.Remark, r.unsorted, "wavelengths were not in order and were sorted")
	}
	if r.repeated > 0 {
		r.note("repeated-point", eem.Remark, r.repeated, "standing twice: "+eem.Count(r.repeated, "wavelength")+"; the mean was taken")
	}
	if r.over > 0 {
		r.note("saturated", eem.Doubt, r.over, eem.Count(r.over, "cell")+" left out: marked as over range in the file")
	}
}

func (r *reader) note(test string, s eem.Severity, found int, msg string) {
	n := eem.Note{Step: "read", Test: test, Severity: s, Msg: msg, File: r.name}
	if found > 0 {
		n.Value, n.Measure = float64(found), true
	}
	r.file.Notes = append(r.file.Notes, n)
}
