package report

import (
	"cmp"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// decimalFormat is the number format with d decimals.
func decimalFormat(d int) string {
	switch {
	case d <= 0:
		return "0"
	case d > 9:
		return "0.00E+00"
	}
	return "0." + strings.Repeat("0", d)
}

// sigFormat is the number format that shows v with d significant digits; with an
// exponent below 1e-4.
func sigFormat(v float64, d int) string {
	if v == 0 || !finite(v) {
		return "0"
	}
	if e := exponent(v, d); e < -4 {
		return decimalFormat(d-1) + "E+00"
	}
	return decimalFormat(d - 1 - exponent(v, d))
}

// statedFormat is the number format that shows v as the text in which it is stated
// does, behind a mark ("< ") or none: with its decimals, or with its exponent.
func (b *book) statedFormat(mark, text string, v float64) string {
	before := ""
	if mark != "" {
		before = strconv.Quote(mark)
	}
	mantissa, exponent, hasExponent := strings.Cut(text, "e")
	shown, err := strconv.ParseFloat(text, 64)
	if err != nil || (hasExponent && exponent == "") {
		return before + sigFormat(v, 3)
	}
	if lo, hi, ok := roundedFrom(shown, v); ok && !hasExponent {
		return b.few(fmt.Sprintf("[<%s]%[2]s0;[>=%[3]s]%[2]s0;%[4]q", Number(lo), before, Number(hi), mark+text),
			before+"0"+strings.Repeat(".", min(1, len(digitsOf(text))-1))+strings.Repeat("0", len(digitsOf(text))-1)+"E+0")
	}
	_, tail, _ := strings.Cut(mantissa, ".")
	format := "0"
	if tail != "" {
		format += "." + strings.Repeat("0", len(tail))
	}
	if hasExponent {
		format += "E+0"
	}
	return before + format
}

// digitsOf are the digits of a number without the zeros behind them.
func digitsOf(text string) string { return cmp.Or(strings.TrimRight(text, "0"), "0") }

// mostFormats bounds the number formats that stand for one number each: Excel takes
// 200 to 250 of one's own in a workbook.
const mostFormats = 120

// few is a format that stands for one number, or the other where there are too many.
func (b *book) few(format, other string) string {
	if !b.special[format] {
		if len(b.special) >= mostFormats {
			return other
		}
		b.special[format] = true
	}
	return format
}

// roundedFrom is the range of numbers that are shown like v where it was rounded to
// tens or more; ok is false where it was not. No format rounds before the point: one
// that shows just these numbers so, and every other one as it is, cannot lie.
func roundedFrom(shown, v float64) (lo, hi float64, ok bool) {
	if math.Abs(v) >= 1e9 || math.Round(v) == shown || shown != math.Trunc(shown) {
		return 0, 0, false
	}
	for p := 10.0; p <= 1e9; p *= 10 {
		if math.Round(v/p)*p == shown {
			return shown - p/2, shown + p/2, true
		}
	}
	return 0, 0, false
}

// shortFormat shows at most five significant digits and no zeros behind them.
func shortFormat(v float64) string {
	d := 4 - exponent(v, 5)
	switch {
	case v == math.Trunc(v) && math.Abs(v) < 1e12 || d <= 0:
		return "0"
	case d > 7:
		return "0.####E+00"
	}
	_, tail, _ := strings.Cut(numbers{}.short(v, 5), ".") // as many as it needs: 100.00001 under "0.####" is "100."
	return decimalFormat(len(tail))
}

// shortLength is how many letters a number takes in its short format, at most.
func shortLength(v float64) int {
	format := shortFormat(v)
	if strings.Contains(format, "E") {
		return len("-0.0000E-00")
	}
	_, tail, _ := strings.Cut(format, ".")
	return len(strconv.FormatFloat(v, 'f', len(tail), 64))
}
