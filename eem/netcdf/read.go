package netcdf

import (
	"bufio"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
)

// maxHeader bounds what is read before anything can be judged, bytes.
const maxHeader = 16 << 20

// File is a file opened for reading. Values are read when asked for; nothing but
// the header is held. It may be used by several goroutines at once.
type File struct {
	Header
	Records int // length of the record dimension
	r       io.ReaderAt
	l       *layout
}

// Read reads the header of a file of size bytes. Whatever the bytes are, it
// neither panics nor takes more memory than a small multiple of the header's
// length in the file, and every offset that it accepts lies inside the file.
func Read(r io.ReaderAt, size int64) (*File, error) {
	d := &decoder{r: bufio.NewReader(io.NewSectionReader(r, 0, size)), left: min(size, maxHeader)}
	var magic [4]byte
	d.bytes(magic[:])
	if d.err != nil || string(magic[:3]) != "CDF" {
		return nil, errors.New("not a NetCDF classic file")
	}
	if magic[3] != 1 && magic[3] != 2 {
		return nil, fmt.Errorf("NetCDF version byte %d; only the classic format with 32- or 64-bit offsets (1, 2) can be read", magic[3])
	}
	f := &File{r: r}
	records := d.uint32()
	f.Dims = d.dims()
	f.Attrs = d.attrs()
	vars, begins := d.vars(magic[3] == 2)
	f.Vars = vars
	if d.err != nil {
		return nil, fmt.Errorf("header: %w", d.err)
	}
	var err error
	if f.l, err = plan(&f.Header, size); err != nil {
		return nil, err
	}
	f.l.begin = begins
	return f, f.bound(size, records)
}

// bound checks that all values lie inside the file and fixes Records.
func (f *File) bound(size int64, records uint32) error {
	fits := int64(math.MaxInt32) // records that lie inside the file
	for i := range f.Vars {
		// Neither difference can overflow: plan bounds the bytes by size.
		left := size - f.l.begin[i] - f.l.bytes(&f.Header, i)
		if f.l.begin[i] < 0 {
			return fmt.Errorf("variable %q begins outside the file", f.Vars[i].Name)
		}
		if !f.l.record[i] && left < 0 {
			return fmt.Errorf("variable %q ends %d bytes behind the end of the file: it was cut short", f.Vars[i].Name, -left)
		}
		if f.l.record[i] {
			n := int64(0)
			if left >= 0 {
				n = left/f.l.recSize + 1
			}
			fits = min(fits, n)
		}
	}
	if f.l.recSize == 0 {
		return nil // no record variable: the number of records says nothing
	}
	if records != streaming {
		if int64(records) > fits {
			return fmt.Errorf("the file was cut short: it should hold %d records and holds %d", records, fits)
		}
		fits = int64(records)
	}
	f.Records = int(fits)
	return nil
}

// Cells returns how many values variable i has, of one record where it is a
// record variable; isRecord says so. It panics when i is not a variable.
func (f *File) Cells(i int) (n int, isRecord bool) { return int(f.l.cells[i]), f.l.record[i] }

// ReadTo reads variable name into dst, a slice of its type and of Cells length;
// record is the record wanted, and 0 for a fixed variable.
func (f *File) ReadTo(dst any, name string, record int) error {
	i := f.Var(name)
	if i < 0 {
		return fmt.Errorf("no variable %q", name)
	}
	t, n, ok := typeOf(dst)
	if !ok || t != f.Vars[i].Type || int64(n) != f.l.cells[i] {
		return fmt.Errorf("variable %q is %d × %v, not %d × %T", name, f.l.cells[i], f.Vars[i].Type, n, dst)
	}
	at := f.l.begin[i]
	if f.l.record[i] {
		if record < 0 || record >= f.Records {
			return fmt.Errorf("variable %q: record %d of %d", name, record, f.Records)
		}
		at += int64(record) * f.l.recSize
	}
	buf, isBytes := dst.([]byte)
	if !isBytes {
		buf = make([]byte, f.l.bytes(&f.Header, i))
	}
	if _, err := f.r.ReadAt(buf, at); err != nil {
		return fmt.Errorf("variable %q: %w", name, err)
	}
	if !isBytes {
		if _, err := binary.Decode(buf, binary.BigEndian, dst); err != nil {
			return fmt.Errorf("variable %q: %w", name, err)
		}
	}
	return nil
}

// decoder reads a header; after the first error it returns zeros.
type decoder struct {
	r    *bufio.Reader
	left int64
	err  error
}

func (d *decoder) fail(format string, args ...any) {
	if d.err == nil {
		d.err = fmt.Errorf(format, args...)
	}
}

func (d *decoder) bytes(b []byte) {
	if int64(len(b)) > d.left {
		d.fail("the file ends inside it")
	}
	if d.err == nil {
		_, err := io.ReadFull(d.r, b)
		d.left -= int64(len(b))
		if err != nil {
			d.fail("the file ends inside it")
		}
	}
	if d.err != nil {
		clear(b)
	}
}

func (d *decoder) uint32() uint32 {
	var b [4]byte
	d.bytes(b[:])
	return binary.BigEndian.Uint32(b[:])
}

// count reads a number of things that take at least size bytes each.
func (d *decoder) count(size int64) int {
	n := int64(d.uint32())
	if n*size > d.left {
		d.fail("it counts %d things where %d bytes are left", n, d.left)
	}
	if d.err != nil {
		return 0
	}
	return int(n)
}

// padded reads n bytes and the padding behind them.
func (d *decoder) padded(n int64) []byte {
	if n > d.left {
		d.fail("the file ends inside it")
	}
	if d.err != nil {
		return nil
	}
	b := make([]byte, n)
	d.bytes(b)
	var pad [3]byte
	d.bytes(pad[:pad4(n)-n])
	return b
}

func (d *decoder) name() string { return string(d.padded(int64(d.count(1)))) }

// list reads the head of a list of things of at least size bytes each.
func (d *decoder) list(tag uint32, size int64) int {
	got := d.uint32()
	n := d.count(size)
	if got != tag && (got != 0 || n != 0) {
		d.fail("a list begins with tag %#x instead of %#x", got, tag)
		return 0
	}
	return n
}

func (d *decoder) dims() []Dim {
	out := make([]Dim, d.list(tagDim, 8))
	records := 0
	for i := range out {
		out[i] = Dim{Name: d.name(), Len: int(int32(d.uint32()))}
		if out[i].Len < 0 {
			d.fail("dimension %q has a negative length", out[i].Name)
		}
		if out[i].Len == 0 && d.err == nil {
			records++
		}
	}
	if records > 1 {
		d.fail("it has %d record dimensions", records)
	}
	return out
}

func (d *decoder) attrs() []Attr {
	var out []Attr
	for range d.list(tagAttr, 12) {
		out = append(out, Attr{Name: d.name(), Value: d.value()})
		if d.err != nil {
			return nil
		}
	}
	return out
}

// value reads the type, count and values of an attribute.
func (d *decoder) value() any {
	t := Type(d.uint32())
	if t.size() == 0 {
		d.fail("an attribute has unknown %v", t)
	}
	n := d.count(max(1, t.size()))
	b := d.padded(int64(n) * t.size())
	if d.err != nil {
		return nil
	}
	var v any
	switch t {
	case Char:
		return string(b)
	case Byte:
		v = make([]int8, n)
	case Short:
		v = make([]int16, n)
	case Int:
		v = make([]int32, n)
	case Float:
		v = make([]float32, n)
	default:
		v = make([]float64, n)
	}
	_, d.err = binary.Decode(b, binary.BigEndian, v)
	return v
}

func (d *decoder) vars(wide bool) ([]Var, []int64) {
	n := d.list(tagVar, 28)
	vars, begins := make([]Var, 0, n), make([]int64, 0, n)
	for range n {
		v := Var{Name: d.name()}
		for range d.count(4) {
			v.Dims = append(v.Dims, int(d.uint32()))
		}
		v.Attrs = d.attrs()
		v.Type = Type(d.uint32())
		d.uint32() // vsize: redundant, and wrong for large variables
		begin := int64(d.uint32())
		if wide {
			begin = begin<<32 | int64(d.uint32())
		}
		if d.err != nil {
			return nil, nil
		}
		vars, begins = append(vars, v), append(begins, begin)
	}
	return vars, begins
}
