package report

import (
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

// sigFormat is the number format that shows v with d significant digits.
func sigFormat(v float64, d int) string {
	if v == 0 || !finite(v) {
		return "0"
	}
	return decimalFormat(d - 1 - exponent(v, d))
}

// reportedFormat is the number format that shows a number as the text of reported
// does: with its decimals, or with its exponent.
func reportedFormat(reported string, v float64) string {
	text := strings.TrimPrefix(reported, "< ")
	mantissa, exponent, hasExponent := strings.Cut(text, "e")
	if _, err := strconv.ParseFloat(text, 64); err != nil || (hasExponent && exponent == "") {
		return sigFormat(v, 3)
	}
	_, tail, _ := strings.Cut(mantissa, ".")
	format := "0"
	if tail != "" {
		format += "." + strings.Repeat("0", len(tail))
	}
	if hasExponent {
		format += "E+0"
	}
	return format
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
	return "0." + strings.Repeat("#", d)
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
