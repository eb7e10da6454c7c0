// Package netcdf reads and writes the classic NetCDF format (CDF-1 and CDF-2
// read, CDF-2 with its 64-bit offsets written): named dimensions, typed
// variables with attributes, and one dimension, the record dimension, along
// which a file can grow. It knows nothing about what the numbers mean.
//
// Format: "NetCDF Classic Format Specification", Unidata, as adopted by OGC
// 10-092r3. All numbers are big-endian, names and values padded to 4 bytes.
package netcdf

import (
	"fmt"
	"math"
)

// Type is the type of a variable or an attribute, with the code of the format.
type Type uint32

// The six types of the classic format and the Go slices that hold them.
const (
	Byte   Type = 1 // []int8
	Char   Type = 2 // []byte, or a string in an attribute
	Short  Type = 3 // []int16
	Int    Type = 4 // []int32
	Float  Type = 5 // []float32
	Double Type = 6 // []float64
)

var typeNames = [...]string{"none", "byte", "char", "short", "int", "float", "double"}

// String names the type as the format's text notation does.
func (t Type) String() string {
	if t >= Byte && t <= Double {
		return typeNames[t]
	}
	return fmt.Sprintf("type %d", uint32(t))
}

// size is the number of bytes of one value, 0 for an unknown type.
func (t Type) size() int64 {
	switch t {
	case Byte, Char:
		return 1
	case Short:
		return 2
	case Int, Float:
		return 4
	case Double:
		return 8
	}
	return 0
}

// Dim is a dimension. A Len of 0 makes it the record dimension, of which a file
// has at most one.
type Dim struct {
	Name string
	Len  int
}

// Attr is a named value of the file or of a variable: a string or a slice of one
// of the types above.
type Attr struct {
	Name  string
	Value any
}

// Var is a variable. Dims are indices into Header.Dims, slowest first; only the
// first may be the record dimension.
type Var struct {
	Name  string
	Type  Type
	Dims  []int
	Attrs []Attr
}

// Attr returns the value of the variable's attribute, nil when it has none.
func (v *Var) Attr(name string) any { return findAttr(v.Attrs, name) }

// Header describes a file.
type Header struct {
	Dims  []Dim
	Attrs []Attr
	Vars  []Var
}

// Attr returns the value of the file's attribute, nil when it has none.
func (h *Header) Attr(name string) any { return findAttr(h.Attrs, name) }

// Var returns the index of a variable, -1 when there is none of that name.
func (h *Header) Var(name string) int {
	for i := range h.Vars {
		if h.Vars[i].Name == name {
			return i
		}
	}
	return -1
}

func findAttr(as []Attr, name string) any {
	for _, a := range as {
		if a.Name == name {
			return a.Value
		}
	}
	return nil
}

// Tags of the lists in a header and the number of records of a file that was
// still growing.
const (
	tagDim    = 0x0A
	tagVar    = 0x0B
	tagAttr   = 0x0C
	streaming = math.MaxUint32
)

// layout says where the values of a file lie.
type layout struct {
	record  []bool  // per variable: grows with the records
	cells   []int64 // per variable: values, of one record where it is a record variable
	begin   []int64 // per variable: offset of the first value
	recSize int64   // bytes from one record to the next
}

func pad4(n int64) int64 { return (n + 3) &^ 3 }

// bytes is the unpadded length of variable i (of one record of it).
func (l *layout) bytes(h *Header, i int) int64 { return l.cells[i] * h.Vars[i].Type.size() }

// plan counts cells and record size. limit bounds the bytes of a variable, so
// that no product of dimensions overflows.
func plan(h *Header, limit int64) (*layout, error) {
	n := len(h.Vars)
	l := &layout{record: make([]bool, n), cells: make([]int64, n), begin: make([]int64, n)}
	records, padded := 0, int64(0)
	for i := range h.Vars {
		v := &h.Vars[i]
		if v.Type.size() == 0 {
			return nil, fmt.Errorf("variable %q has unknown %v", v.Name, v.Type)
		}
		cells := int64(1)
		for k, d := range v.Dims {
			if d < 0 || d >= len(h.Dims) {
				return nil, fmt.Errorf("variable %q names dimension %d of %d", v.Name, d, len(h.Dims))
			}
			length := int64(h.Dims[d].Len)
			if length == 0 {
				if k > 0 {
					return nil, fmt.Errorf("variable %q: the record dimension must come first", v.Name)
				}
				l.record[i] = true
				continue
			}
			if length < 0 || cells > limit/v.Type.size()/length {
				return nil, fmt.Errorf("variable %q is larger than %d bytes", v.Name, limit)
			}
			cells *= length
		}
		l.cells[i] = cells
		if l.record[i] {
			records++
			l.recSize = l.bytes(h, i)
			padded += pad4(l.recSize)
		}
	}
	// The format leaves out the padding when there is one record variable only.
	if records != 1 {
		l.recSize = padded
	}
	return l, nil
}
