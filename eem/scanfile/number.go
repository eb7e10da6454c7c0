package scanfile

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"math/bits"
	"strconv"
)

// ParseNumber reads one number as people and instruments write it: a decimal
// mark of "." or "," (decimal; "" decides from s alone and refuses what can be
// read twice, such as "1,234"), groups of three digits set apart by the other
// mark, an apostrophe or a blank, exponents (1,23E+03), a true minus sign. The
// result is the nearest float64, always finite. An empty or missing cell is an
// error here; see Missing.
func ParseNumber(s, decimal string) (float64, error) {
	b := bytes.TrimSpace([]byte(s))
	if decimal == "" {
		var e evidence
		e.add(b, 0)
		d, err := e.decide()
		if err != nil {
			return 0, fmt.Errorf("%q can be read as a decimal comma and as a thousands comma; give the decimal mark", s)
		}
		decimal = d
	}
	if decimal != "." && decimal != "," {
		return 0, fmt.Errorf("decimal mark %q; it is %q or %q", decimal, ".", ",")
	}
	v, ok := parseNumber(b, decimal[0])
	if !ok {
		return 0, fmt.Errorf("%q is not a number", s)
	}
	return v, nil
}

// pow10 are the powers of ten that a float64 holds exactly.
var pow10 = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// prefixNumber reads the number at the start of b and says how many bytes it
// took; 0 leaves the cell to parseNumber. It takes only what one multiplication
// or division of two exact float64 rounds correctly (Clinger 1990, How to read
// floating point numbers accurately): up to 18 digits below 2⁵³, a power of ten
// up to 22.
func prefixNumber(b []byte, dec byte) (float64, int) {
	i, neg := 0, false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		neg = b[0] == '-'
		i = 1
	}
	var m uint64
	start := i
	for i < len(b) && b[i]-'0' <= 9 {
		m = m*10 + uint64(b[i]-'0')
		i++
	}
	digits, exp := i-start, 0
	if i < len(b) && b[i] == dec {
		i++
		start = i
		for i < len(b) && b[i]-'0' <= 9 {
			m = m*10 + uint64(b[i]-'0')
			i++
		}
		exp = start - i
		digits += i - start
	}
	if digits == 0 || digits > 18 || m > 1<<53 {
		return 0, 0
	}
	if i < len(b) && b[i]|0x20 == 'e' {
		e, n := exponent(b[i+1:])
		if n == 0 {
			return 0, 0
		}
		exp += e
		i += 1 + n
	}
	if exp < -22 || exp > 22 {
		return 0, 0
	}
	v := float64(m)
	if exp < 0 {
		v /= pow10[-exp]
	} else {
		v *= pow10[exp]
	}
	if neg {
		v = -v
	}
	return v, i
}

var wholePow10 = [9]uint64{1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8}

// eightDigits reads the digits at the start of b, eight at most, and says how
// many there are. b has eight bytes or more.
func eightDigits(b []byte) (v uint64, n int) {
	const ones = 0x0101010101010101
	x := binary.LittleEndian.Uint64(b) ^ '0'*ones // a digit is its value now
	// The top bit of each byte that is above 9; a carry can only spoil bytes
	// behind the first such one.
	other := (x | (x + (0x80-10)*ones)) & (0x80 * ones)
	n = bits.TrailingZeros64(other) / 8
	x <<= uint(64 - 8*n)                   // leading zeros for the digits that are not there
	x = (x*10 + x>>8) & 0x00ff00ff00ff00ff // pairs of digits
	x = (x*100 + x>>16) & 0x0000ffff0000ffff
	return (x*10000 + x>>32) & 0xffffffff, n
}

// exponent reads a sign and one to three digits.
func exponent(b []byte) (e, n int) {
	neg := false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		neg = b[0] == '-'
		n = 1
	}
	start := n
	for n < len(b) && b[n]-'0' <= 9 {
		e = e*10 + int(b[n]-'0')
		n++
		if n-start > 3 {
			return 0, 0
		}
	}
	if n == start {
		return 0, 0
	}
	if neg {
		e = -e
	}
	return e, n
}

// parseNumber reads a whole trimmed cell.
func parseNumber(b []byte, dec byte) (float64, bool) {
	if v, n := prefixNumber(b, dec); n > 0 && n == len(b) {
		return v, true
	}
	var buf [64]byte
	clean, ok := cleanNumber(buf[:0], b, dec)
	if !ok {
		return 0, false
	}
	v, err := strconv.ParseFloat(string(clean), 64)
	return v, err == nil && !math.IsInf(v, 0) && !math.IsNaN(v)
}

// maxNumberBytes is the longest text taken for a number.
const maxNumberBytes = 400

// cleanNumber appends the number b to dst in the form of strconv: no groups, a
// decimal point, a plain sign. It is false where b is no number.
func cleanNumber(dst, b []byte, dec byte) ([]byte, bool) {
	if len(b) > maxNumberBytes {
		return dst, false
	}
	sign, b := cutSign(b)
	dst = append(dst, sign...)
	whole, rest, ok := groups(dst, b, dec)
	if !ok {
		return dst, false
	}
	digits := len(whole) - len(dst)
	dst = whole
	if len(rest) > 0 && rest[0] == dec {
		dst = append(dst, '.')
		n := leadingDigits(rest[1:])
		dst = append(dst, rest[1:1+n]...)
		rest = rest[1+n:]
		digits += n
	}
	if digits == 0 {
		return dst, false
	}
	if len(rest) == 0 {
		return dst, true
	}
	if c := rest[0] | 0x20; c != 'e' && c != 'd' {
		return dst, false
	}
	sign, rest = cutSign(rest[1:])
	if n := leadingDigits(rest); n == 0 || n != len(rest) {
		return dst, false
	}
	dst = append(dst, 'e')
	dst = append(dst, sign...)
	return append(dst, rest...), true
}

func cutSign(b []byte) (sign string, rest []byte) {
	switch {
	case len(b) == 0:
	case b[0] == '-':
		return "-", b[1:]
	case b[0] == '+':
		return "", b[1:]
	case bytes.HasPrefix(b, []byte("\u2212")): // the minus sign of typography
		return "-", b[len("\u2212"):]
	}
	return "", b
}

func leadingDigits(b []byte) int {
	n := 0
	for n < len(b) && b[n]-'0' <= 9 {
		n++
	}
	return n
}

// groupMarks may set groups of three digits apart, beside the mark that is not
// the decimal one.
var groupMarks = [][]byte{[]byte(" "), []byte("'"), []byte("\u00a0"), []byte("\u202f"), []byte("\u2009"), []byte("\u2019")}

// groupMark returns the length of the group mark at the start of b.
func groupMark(b []byte, dec byte) int {
	if len(b) == 0 || b[0]-'0' <= 9 || b[0] == dec {
		return 0
	}
	if b[0] == '.' || b[0] == ',' {
		return 1
	}
	for _, m := range groupMarks {
		if bytes.HasPrefix(b, m) {
			return len(m)
		}
	}
	return 0
}

// groups appends the digits before the decimal mark: plain, or 1–3 digits and
// groups of exactly three with one mark throughout, the first group not 0.
func groups(dst, b []byte, dec byte) (out, rest []byte, ok bool) {
	n := leadingDigits(b)
	dst = append(dst, b[:n]...)
	m := groupMark(b[n:], dec)
	if m == 0 {
		return dst, b[n:], true
	}
	if n == 0 || n > 3 || b[0] == '0' {
		return dst, nil, false
	}
	mark := b[n : n+m]
	b = b[n:]
	for bytes.HasPrefix(b, mark) {
		b = b[m:]
		if leadingDigits(b) != 3 {
			return dst, nil, false
		}
		dst = append(dst, b[:3]...)
		b = b[3:]
	}
	return dst, b, true
}

// looksNumeric says whether a trimmed cell is a number with one decimal mark or
// the other.
func looksNumeric(b []byte) bool {
	if _, n := prefixNumber(b, '.'); n > 0 && n == len(b) {
		return true
	}
	var buf [64]byte
	if _, ok := cleanNumber(buf[:0], b, '.'); ok {
		return true
	}
	_, ok := cleanNumber(buf[:0], b, ',')
	return ok
}
