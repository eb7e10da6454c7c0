package scanfile

import (
	"bytes"
	"strings"
)

// Missing says whether a cell stands for "no value": blank, NaN, NA, n/a, dashes,
// or a mark of overflow (OVER, ####).
func Missing(cell string) bool {
	return missing([]byte(strings.TrimSpace(cell))) != present
}

type absence uint8

const (
	present  absence = iota // some text, perhaps a number
	blank                   // nothing measured
	overflow                // the detector was past its limit
)

// missing classifies a trimmed cell.
func missing(b []byte) absence {
	if len(b) == 0 {
		return blank
	}
	if len(b) > 12 {
		return present
	}
	switch b[0] {
	case '-', '.', '*', '#':
		if len(bytes.Trim(b, string(b[:1]))) == 0 && !(b[0] == '.' && len(b) == 1) {
			if b[0] == '#' || b[0] == '*' {
				return overflow // a number wider than its column
			}
			return blank
		}
	}
	switch strings.ToLower(string(b)) {
	case "nan", "na", "n/a", "n.a.", "#n/a", "null", "nil", "none", "missing", "-nan", "+nan", "1.#qnan", "-1.#ind", "\u2013", "\u2014":
		return blank
	case "over", "ovr", "ovf", "ovl", "ovld", "over range", "overrange", "overflow", "overload", "sat", "saturated", "inf", "+inf", "1.#inf", "infinity":
		return overflow
	}
	return present
}
