package scanfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"slices"
	"unicode/utf8"

	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
)

// Load reads a file of at most MaxFileBytes for the readers that take bytes, so
// that a caller can hash and parse the same bytes. It refuses what is no regular
// file.
func Load(path string) ([]byte, error) { return load(path, nil) }

// load reads a file into buf, or into a larger slice where that is too small.
func load(path string, buf []byte) ([]byte, error) {
	f, mode, size, err := openFile(path)
	if err != nil {
		return nil, err // names the path
	}
	defer f.Close() //nolint:errcheck // only read
	switch {
	case mode.IsDir():
		return nil, fmt.Errorf("%s: is a folder; name a file", path)
	case !mode.IsRegular():
		return nil, fmt.Errorf("%s: is no regular file; copy its content to a file", path)
	case size > MaxFileBytes:
		return nil, tooLarge(path)
	}
	// The file may grow or shrink while it is read: ask for one byte more than
	// it had, and never for more than the limit.
	data := slices.Grow(buf[:0], int(size)+1)
	for {
		n, err := f.Read(data[len(data):cap(data)])
		data = data[:len(data)+n]
		if errors.Is(err, io.EOF) || err == nil && int64(len(data)) == size && len(data) < cap(data) {
			return data, nil
		}
		if err != nil {
			return nil, fmt.Errorf("%s: %w", path, err)
		}
		if len(data) > MaxFileBytes {
			return nil, tooLarge(path)
		}
		if len(data) == cap(data) {
			data = append(data, 0)[:len(data)]
		}
	}
}

func tooLarge(name string) error {
	return fmt.Errorf("%s: larger than %d MB, which no scan or table is; check that this is the right file", name, MaxFileBytes>>20)
}

// errorf makes the error of a place: "name:line: …", or "name: …" for line 0.
func errorf(name string, line int, format string, args ...any) error {
	if line > 0 {
		return fmt.Errorf("%s:%d: "+format, append([]any{name, line}, args...)...)
	}
	return fmt.Errorf("%s: "+format, append([]any{name}, args...)...)
}

// decode returns data as UTF-8 without byte-order mark, with line ends \n or
// \r\n, and says what the encoding was. In this order: a byte-order mark; NUL
// bytes at every other place (UTF-16 without a mark); valid UTF-8; else
// Windows-1252, in which every byte means something.
func decode(name string, data []byte) (text []byte, encoding string, err error) {
	if len(data) > MaxFileBytes {
		return nil, "", tooLarge(name)
	}
	switch {
	case bytes.HasPrefix(data, []byte("\xef\xbb\xbf")):
		text, encoding = data[3:], "UTF-8"
	case bytes.HasPrefix(data, []byte("\xff\xfe")):
		text, encoding, err = fromUTF16(data[2:], unicode.LittleEndian)
	case bytes.HasPrefix(data, []byte("\xfe\xff")):
		text, encoding, err = fromUTF16(data[2:], unicode.BigEndian)
	default:
		if order, ok := utf16Order(data); ok {
			text, encoding, err = fromUTF16(data, order)
		} else {
			text, encoding = data, "UTF-8"
		}
	}
	if err != nil {
		return nil, "", errorf(name, 0, "cannot be decoded: %w", err)
	}
	text = bytes.TrimRight(text, "\x1a") // end-of-file mark of old systems
	if i := bytes.IndexByte(text, 0); i >= 0 {
		return nil, "", errorf(name, 1+bytes.Count(text[:i], []byte("\n")),
			"holds NUL bytes, so it is no text or was damaged; export it again as text")
	}
	if !utf8.Valid(text) {
		encoding = "Windows-1252"
		if text, err = charmap.Windows1252.NewDecoder().Bytes(text); err != nil {
			return nil, "", errorf(name, 0, "cannot be decoded: %w", err)
		}
	}
	if len(bytes.TrimSpace(text)) == 0 {
		return nil, "", errorf(name, 0, "is empty; export it again")
	}
	return plainLineEnds(text), encoding, nil
}

func fromUTF16(data []byte, order unicode.Endianness) ([]byte, string, error) {
	name := "UTF-16 LE"
	if order == unicode.BigEndian {
		name = "UTF-16 BE"
	}
	text, err := unicode.UTF16(order, unicode.IgnoreBOM).NewDecoder().Bytes(data)
	return text, name, err
}

// utf16Order tells UTF-16 without byte-order mark by the NUL bytes that Latin
// letters and digits have in it: nearly all at odd places, or nearly all at even.
func utf16Order(data []byte) (unicode.Endianness, bool) {
	head := data[:min(len(data), 4096)]
	if bytes.IndexByte(head, 0) < 0 {
		return unicode.LittleEndian, false
	}
	var nul [2]int
	for i, b := range head {
		if b == 0 {
			nul[i&1]++
		}
	}
	half := len(head) / 2
	switch {
	case nul[1] > half*7/10 && nul[0] <= nul[1]/20:
		return unicode.LittleEndian, true
	case nul[0] > half*7/10 && nul[1] <= nul[0]/20:
		return unicode.BigEndian, true
	}
	return unicode.LittleEndian, false
}

// plainLineEnds turns every carriage return that stands alone (old exports) into
// a line feed. It copies only when there is one.
func plainLineEnds(text []byte) []byte {
	alone := func(i int) bool { return text[i] == '\r' && (i+1 == len(text) || text[i+1] != '\n') }
	for i := bytes.IndexByte(text, '\r'); i < len(text) && i >= 0; i++ {
		if !alone(i) {
			continue
		}
		out := bytes.Clone(text)
		for ; i < len(text); i++ {
			if alone(i) {
				out[i] = '\n'
			}
		}
		return out
	}
	return text
}

// cutLine returns the first line of text without its end, and the rest.
func cutLine(text []byte) (line, rest []byte) {
	i := bytes.IndexByte(text, '\n')
	if i < 0 {
		return text, nil
	}
	line, rest = text[:i], text[i+1:]
	if i > 0 && line[i-1] == '\r' {
		line = line[:i-1]
	}
	return line, rest
}
