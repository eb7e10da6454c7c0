package report

import (
	"math"
	"regexp"
	"strconv"
	"strings"
)

// numbers writes numbers for people: with the decimal mark of the settings and a
// true minus sign.
type numbers struct{ comma bool }

func (n numbers) mark(s string) string {
	if n.comma {
		s = strings.Replace(s, ".", ",", 1)
	}
	return strings.Replace(s, "-", "−", 1)
}

// sig writes v with d significant digits; without an exponent between 1e-4 and
// 1e6.
func (n numbers) sig(v float64, d int) string {
	switch {
	case math.IsNaN(v):
		return "–"
	case math.IsInf(v, 1):
		return "∞"
	case math.IsInf(v, -1):
		return "−∞"
	case v == 0:
		return "0"
	}
	e := exponent(v, d)
	if e < -4 || e >= 6 {
		m := n.fixed(v/math.Pow(10, float64(e)), d-1)
		return m + " · 10" + superscript(e)
	}
	return n.fixed(v, d-1-e)
}

// short writes v with at most d significant digits and no zeros behind them.
func (n numbers) short(v float64, d int) string {
	s := numbers{}.sig(v, d)
	if head, tail, ok := strings.Cut(s, "."); ok && !strings.Contains(s, "·") {
		if tail = strings.TrimRight(tail, "0"); tail != "" {
			tail = "." + tail
		}
		s = head + tail
	}
	return n.mark(s)
}

// stated writes a result that was rounded before (merit.Rounded) for people; one that
// is told in words stays as it is.
func (n numbers) stated(text string) string {
	if _, err := strconv.ParseFloat(strings.TrimPrefix(text, "< "), 64); err != nil {
		return text
	}
	m, e, ok := strings.Cut(text, "e")
	if p, err := strconv.Atoi(e); ok && err == nil {
		return n.mark(m) + " · 10" + superscript(p)
	}
	return n.mark(text)
}

var fraction = regexp.MustCompile(`-?\d+\.\d+(e[-+]?\d+)?`)

// rounded is a text in which every number with decimals has at most four
// significant digits: what a measured parameter is worth in a description.
func (n numbers) rounded(text string) string {
	return fraction.ReplaceAllStringFunc(text, func(s string) string {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			return s
		}
		return n.short(v, 4)
	})
}

// nm writes a wavelength with at most one decimal.
func (n numbers) nm(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return n.sig(v, 1)
	}
	return n.mark(strconv.FormatFloat(math.Round(v*10)/10, 'f', -1, 64))
}

// exponent is the decimal exponent of v rounded to d significant digits.
func exponent(v float64, d int) int {
	s := strconv.FormatFloat(math.Abs(v), 'e', d-1, 64)
	e, _ := strconv.Atoi(s[strings.IndexByte(s, 'e')+1:])
	return e
}

// fixed writes v with the given number of decimals; rounded to tens and more
// where it is negative.
func (n numbers) fixed(v float64, decimals int) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return n.sig(v, 1)
	}
	if decimals < 0 {
		p := math.Pow(10, float64(-decimals))
		v, decimals = math.Round(v/p)*p, 0
	}
	s := strconv.FormatFloat(v, 'f', decimals, 64)
	if strings.Trim(s, "-0.") == "" {
		s = strings.TrimPrefix(s, "-")
	}
	return n.mark(s)
}

func superscript(e int) string {
	digits := []rune("⁰¹²³⁴⁵⁶⁷⁸⁹")
	var b strings.Builder
	for _, c := range strconv.Itoa(e) {
		if c == '-' {
			b.WriteRune('⁻')
		} else {
			b.WriteRune(digits[c-'0'])
		}
	}
	return b.String()
}

// niceStep returns the step 1, 2 or 5 · 10ⁿ that cuts span into at most n parts.
func niceStep(span float64, n int) float64 {
	if !(span > 0) || math.IsInf(span, 0) {
		return 1
	}
	raw := span / float64(n)
	p := math.Pow(10, math.Floor(math.Log10(raw)))
	for _, m := range []float64{1, 2, 5, 10} {
		if m*p >= raw*(1-1e-9) {
			return m * p
		}
	}
	return 10 * p
}

// ticks returns round values within [lo, hi], at most n + 1 of them.
func ticks(lo, hi float64, n int) []float64 {
	step := niceStep(hi-lo, n)
	first, last := math.Ceil(lo/step-1e-9), math.Floor(hi/step+1e-9)
	if !(last-first < 1000) {
		return nil
	}
	var out []float64
	for k := first; k <= last; k++ {
		out = append(out, k*step+0) // +0: no negative zero
	}
	return out
}

// tickText writes ticks with the decimals that their step needs, and the power
// of ten they share where they are very large or small.
func (n numbers) tickText(at []float64) (text []string, power int) {
	if len(at) == 0 {
		return nil, 0
	}
	top := max(math.Abs(at[0]), math.Abs(at[len(at)-1]))
	if top > 0 && (top >= 1e5 || top < 1e-3) {
		power = exponent(top, 1)
	}
	scale := math.Pow(10, float64(power))
	step := top / scale
	if len(at) > 1 {
		step = (at[1] - at[0]) / scale
	}
	d := 0
	if step > 0 {
		d = max(0, -int(math.Floor(math.Log10(step)+1e-9)))
	}
	for _, v := range at {
		text = append(text, n.fixed(v/scale, d))
	}
	return text, power
}

// ceilNice rounds a positive scale end up to two digits of step 0.5.
func ceilNice(v float64) float64 {
	if !(v > 0) || math.IsInf(v, 0) {
		return 1
	}
	p := math.Pow(10, math.Floor(math.Log10(v))-1) * 5
	return math.Ceil(v/p*(1-1e-12)) * p
}

// number reads a number as a run sheet writes it, with a decimal point or comma.
func number(s string) (float64, bool) {
	v, err := strconv.ParseFloat(strings.Replace(strings.TrimSpace(s), ",", ".", 1), 64)
	return v, err == nil && v-v == 0
}
