package merit

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"tarnlight/unmix"
)

// StatedDigits is how many significant digits of an expanded uncertainty are stated
// where no setting says otherwise (GUM, JCGM 100:2008, 7.2.6; EA-4/02 M:2022, 6.3,
// from memory: at most two).
const StatedDigits = 2

// Place is the decimal place, counted behind the point and negative before it, of the
// last of so many significant digits of an expanded uncertainty: there a value and
// what stands behind its ± both end. ok is false where that says nothing.
func Place(expanded float64, n int) (place int, ok bool) {
	if !(expanded > 0) || math.IsInf(expanded, 0) {
		return 0, false
	}
	return n - 1 - exponent(expanded, n), true
}

// Rounded is a value as it is stated: to the place of its expanded uncertainty, plain
// where that is readable, with an exponent elsewhere; to four digits where that is
// unknown.
func Rounded(value, expanded float64, n int) string {
	place, ok := Place(expanded, n)
	if !ok {
		return digits(value, 4)
	}
	return atPlace(value, place, awkward(max(math.Abs(value), expanded), place))
}

// RoundedExpanded is the expanded uncertainty that stands behind Rounded of the same
// value, in the same form; empty where it is unknown.
func RoundedExpanded(value, expanded float64, n int) string {
	place, ok := Place(expanded, n)
	if !ok {
		return ""
	}
	return atPlace(expanded, place, awkward(max(math.Abs(value), expanded), place))
}

// Round states the values that are numbers again, to so many digits of their
// uncertainties.
func (j *Judged) Round(n int) {
	for _, list := range [][]unmix.Contribution{j.Contributions, j.Beyond} {
		for i := range list {
			if c := &list[i]; slices.Contains([]string{"", unmix.Unreliable}, c.Qualifier) && c.Reported == Rounded(c.Value, c.Expanded(), StatedDigits) {
				c.Reported = Rounded(c.Value, c.Expanded(), n)
			}
		}
	}
}

// awkward says whether a number is read more easily with an exponent.
func awkward(v float64, place int) bool {
	e := exponent(v, 1)
	return v != 0 && (e < -4 || e > 6 || place > 9)
}

// atPlace writes v with its last digit at a decimal place.
func atPlace(v float64, place int, withExponent bool) string {
	v = tiesUp(v)
	if place < 0 && !withExponent {
		p := math.Pow(10, float64(-place))
		return strconv.FormatFloat(math.Round(v/p)*p, 'f', 0, 64)
	}
	if !withExponent {
		return strconv.FormatFloat(v, 'f', place, 64)
	}
	d := exponentOf(strconv.FormatFloat(v, 'e', -1, 64)) + place // decimals of the mantissa
	if d < 0 {                                                   // less than one unit of the place
		if v = math.Round(v * math.Pow(10, float64(place))); v == 0 {
			return "0"
		}
		return fmt.Sprintf("1e%d", -place)
	}
	text := strconv.FormatFloat(v, 'e', d, 64)
	if exponentOf(text)+place > d { // rounding made it one digit longer
		text = strconv.FormatFloat(v, 'e', d+1, 64)
	}
	return strings.NewReplacer("e-0", "e-", "e+0", "e+").Replace(text)
}

// tiesUp moves v so little that of two equally near numbers the larger is taken:
// spreadsheets do so, and see 15 digits of a number.
func tiesUp(v float64) float64 {
	if seen, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', 14, 64), 64); err == nil {
		return seen * (1 + 4e-16)
	}
	return v
}

// exponent is the decimal exponent of v rounded to so many significant digits.
func exponent(v float64, n int) int {
	return exponentOf(strconv.FormatFloat(v, 'e', n-1, 64))
}

func exponentOf(text string) int {
	e, _ := strconv.Atoi(text[strings.IndexByte(text, 'e')+1:])
	return e
}

// digits is v to so many significant digits.
func digits(v float64, n int) string {
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return strconv.FormatFloat(v, 'g', -1, 64)
	}
	place := n - 1 - exponent(v, n)
	return atPlace(v, place, awkward(v, 0))
}
