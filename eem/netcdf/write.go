package netcdf

import (
	"bufio"
	"encoding/binary"
	"fmt"
	"io"
	"math"
)

// Writer writes one file: the fixed variables in any order, then record by
// record. Memory stays that of one record. After Close the file is complete;
// before, it reads as a file without records.
type Writer struct {
	w       io.WriteSeeker
	b       *bufio.Writer
	h       Header
	l       *layout
	buf     []byte
	put     []bool // which fixed variables have their values
	records uint32
	err     error
}

// NewWriter writes the header of a CDF-2 file to w, which must be at its start.
// It panics when the header is not a lawful one: an empty or repeated name, a
// dimension that does not exist, two record dimensions, an attribute of a type
// the format does not have.
func NewWriter(w io.WriteSeeker, h Header) (*Writer, error) {
	l, err := plan(&h, math.MaxInt64)
	if err != nil {
		panic("netcdf: " + err.Error())
	}
	checkNames(&h)
	head := encodeHeader(&h, l)
	place(&h, l, int64(len(head)))
	head = encodeHeader(&h, l) // same length, now with the offsets
	n := &Writer{w: w, b: bufio.NewWriterSize(w, 1<<18), h: h, l: l, put: make([]bool, len(h.Vars))}
	_, n.err = n.b.Write(head)
	for i := range h.Vars { // room for the fixed variables: Put comes back to them
		if !l.record[i] {
			n.zeros(pad4(l.bytes(&h, i)))
		}
	}
	return n, n.err
}

// checkNames panics on names the format forbids and on a second record dimension.
func checkNames(h *Header) {
	seen := map[string]bool{}
	name := func(kind, s string) {
		if s == "" || seen[kind+s] {
			panic(fmt.Sprintf("netcdf: empty or repeated name %q", s))
		}
		seen[kind+s] = true
	}
	records := 0
	for _, d := range h.Dims {
		name("dim ", d.Name)
		if d.Len == 0 {
			records++
		}
	}
	if records > 1 {
		panic("netcdf: more than one record dimension")
	}
	for _, v := range h.Vars {
		name("var ", v.Name)
	}
}

// place lays the fixed variables behind the header, then the records.
func place(h *Header, l *layout, at int64) {
	for _, record := range []bool{false, true} {
		for i := range h.Vars {
			if l.record[i] == record {
				l.begin[i] = at
				at += pad4(l.bytes(h, i))
			}
		}
	}
}

func (w *Writer) zeros(n int64) {
	var zero [4096]byte
	for n > 0 && w.err == nil {
		m := min(n, int64(len(zero)))
		_, w.err = w.b.Write(zero[:m])
		n -= m
	}
}

// Put writes a fixed variable. data is a slice of the variable's type. It panics
// on an unknown or a record variable, after the first Append, and on data of the
// wrong type or length.
func (w *Writer) Put(name string, data any) error {
	i := w.h.Var(name)
	if i < 0 || w.l.record[i] || w.records > 0 {
		panic(fmt.Sprintf("netcdf: no fixed variable %q to write now", name))
	}
	w.encode(i, data)
	w.put[i] = true
	if w.err == nil {
		w.err = w.b.Flush()
	}
	w.seek(w.l.begin[i], io.SeekStart)
	if w.err == nil {
		_, w.err = w.w.Write(w.buf)
	}
	w.seek(0, io.SeekEnd)
	return w.err
}

func (w *Writer) seek(at int64, whence int) {
	if w.err == nil {
		_, w.err = w.w.Seek(at, whence)
	}
}

// Append writes one record: a slice for every record variable, in the order of
// the header. It panics on data of the wrong number, type or length.
func (w *Writer) Append(data ...any) error {
	if w.records == streaming-1 {
		return fmt.Errorf("netcdf: more than %d records", w.records)
	}
	next, padded := 0, w.l.padded(&w.h)
	for i := range w.h.Vars {
		if !w.l.record[i] {
			continue
		}
		if next == len(data) {
			panic(fmt.Sprintf("netcdf: a record of %d variables", next))
		}
		w.encode(i, data[next])
		next++
		if !padded {
			w.buf = w.buf[:w.l.bytes(&w.h, i)]
		}
		if w.err == nil {
			_, w.err = w.b.Write(w.buf)
		}
	}
	if next != len(data) {
		panic(fmt.Sprintf("netcdf: %d slices for a record of %d variables", len(data), next))
	}
	w.records++
	return w.err
}

// padded says whether records are padded: they are unless there is one record
// variable only.
func (l *layout) padded(h *Header) bool {
	n := 0
	for i := range h.Vars {
		if l.record[i] {
			n++
		}
	}
	return n != 1
}

// encode puts the bytes of data, padded, into w.buf.
func (w *Writer) encode(i int, data any) {
	t, n, ok := typeOf(data)
	if v := &w.h.Vars[i]; !ok || t != v.Type || int64(n) != w.l.cells[i] {
		panic(fmt.Sprintf("netcdf: %d × %T for %s %s of %d", n, data, v.Type, v.Name, w.l.cells[i]))
	}
	w.buf = appendValues(w.buf[:0], data)
}

// Close completes the file: the number of records is written last. It does not
// close the underlying writer. It panics when a fixed variable was never put.
func (w *Writer) Close() error {
	for i := range w.h.Vars {
		if w.err == nil && !w.l.record[i] && !w.put[i] {
			panic(fmt.Sprintf("netcdf: %s was never written", w.h.Vars[i].Name))
		}
	}
	if w.err == nil {
		w.err = w.b.Flush()
	}
	w.seek(4, io.SeekStart)
	if w.err == nil {
		w.err = binary.Write(w.w, binary.BigEndian, w.records)
	}
	w.seek(0, io.SeekEnd)
	return w.err
}

// typeOf returns type and length of a slice or string the format can hold.
func typeOf(data any) (t Type, n int, ok bool) {
	switch d := data.(type) {
	case []int8:
		return Byte, len(d), true
	case []byte:
		return Char, len(d), true
	case string:
		return Char, len(d), true
	case []int16:
		return Short, len(d), true
	case []int32:
		return Int, len(d), true
	case []float32:
		return Float, len(d), true
	case []float64:
		return Double, len(d), true
	}
	return 0, 0, false
}

// appendValues appends the values, big-endian, and pads to 4 bytes.
func appendValues(b []byte, data any) []byte {
	start := len(b)
	switch d := data.(type) {
	case string:
		b = append(b, d...)
	case []byte:
		b = append(b, d...)
	default:
		b, _ = binary.Append(b, binary.BigEndian, data) // slices of fixed-size numbers cannot fail
	}
	for (len(b)-start)%4 != 0 {
		b = append(b, 0)
	}
	return b
}

func appendName(b []byte, name string) []byte {
	b = binary.BigEndian.AppendUint32(b, uint32(len(name)))
	return appendValues(b, name)
}

func appendList(b []byte, tag uint32, n int) []byte {
	if n == 0 {
		tag = 0
	}
	b = binary.BigEndian.AppendUint32(b, tag)
	return binary.BigEndian.AppendUint32(b, uint32(n))
}

func appendAttrs(b []byte, as []Attr) []byte {
	b = appendList(b, tagAttr, len(as))
	for _, a := range as {
		t, n, ok := typeOf(a.Value)
		if !ok {
			panic(fmt.Sprintf("netcdf: attribute %s holds a %T", a.Name, a.Value))
		}
		b = appendName(b, a.Name)
		b = binary.BigEndian.AppendUint32(b, uint32(t))
		b = binary.BigEndian.AppendUint32(b, uint32(n))
		b = appendValues(b, a.Value)
	}
	return b
}

func encodeHeader(h *Header, l *layout) []byte {
	b := []byte{'C', 'D', 'F', 2, 0, 0, 0, 0}
	b = appendList(b, tagDim, len(h.Dims))
	for _, d := range h.Dims {
		b = appendName(b, d.Name)
		b = binary.BigEndian.AppendUint32(b, uint32(d.Len))
	}
	b = appendAttrs(b, h.Attrs)
	b = appendList(b, tagVar, len(h.Vars))
	for i := range h.Vars {
		v := &h.Vars[i]
		b = appendName(b, v.Name)
		b = binary.BigEndian.AppendUint32(b, uint32(len(v.Dims)))
		for _, d := range v.Dims {
			b = binary.BigEndian.AppendUint32(b, uint32(d))
		}
		b = appendAttrs(b, v.Attrs)
		b = binary.BigEndian.AppendUint32(b, uint32(v.Type))
		// vsize is redundant; the format says what stands there when it is too small.
		b = binary.BigEndian.AppendUint32(b, uint32(min(pad4(l.bytes(h, i)), math.MaxUint32)))
		b = binary.BigEndian.AppendUint64(b, uint64(l.begin[i]))
	}
	return b
}
