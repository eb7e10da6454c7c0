package scanfile

import (
	"bytes"
	"math"
)

// jcampOrdinates reads (X++(Y..Y)): each line is an abscissa and the ordinates
// from there on, at equal steps from FIRSTX to LASTX. FIRSTX, LASTX, NPOINTS,
// DELTAX, the abscissas of the lines and the check values of differences must
// agree with what is read.
func (r *reader) jcampOrdinates(b *jcampBlock, scale [2]float64) (x, y []float64, err error) {
	var head [3]float64
	for i, l := range []string{"FIRSTX", "LASTX", "NPOINTS"} {
		v, ok, err := r.jcampNumber(b, l)
		if err != nil {
			return nil, nil, err
		}
		if !ok {
			return nil, nil, errorf(r.name, b.at, "the record ##%s= is missing; export the spectrum again", l)
		}
		head[i] = v
	}
	first, last, n := head[0], head[1], int(head[2])
	if head[2] != float64(n) || n < 2 || n > maxJCAMPPoints {
		return nil, nil, errorf(r.name, b.line, "NPOINTS is %g; a spectrum has 2 to %d points", head[2], maxJCAMPPoints)
	}
	step := (last - first) / float64(n-1)
	if d, ok, err := r.jcampNumber(b, "DELTAX"); err != nil {
		return nil, nil, err
	} else if ok && d != 0 && math.Abs(math.Abs(d)-math.Abs(step))*float64(n-1) > math.Abs(step)/2 {
		return nil, nil, errorf(r.name, b.line, "DELTAX is %g, but FIRSTX, LASTX and NPOINTS make it %g; repair the records", d, step)
	}
	a := ordinates{limit: n}
	for _, t := range b.data {
		if len(bytes.TrimSpace(t.text)) == 0 {
			continue
		}
		at, msg := a.line(t.text)
		if msg != "" {
			return nil, nil, errorf(r.name, t.no, "%s; export the file again", msg)
		}
		if want := first + float64(at.index)*step; math.Abs(at.x*scale[0]-want) > math.Abs(step)+1e-6*math.Abs(want) {
			return nil, nil, errorf(r.name, t.no, "the line begins at %g where FIRSTX, LASTX and NPOINTS say %g; was a line lost? Export the file again", at.x*scale[0], want)
		}
	}
	if len(a.y) != n {
		return nil, nil, errorf(r.name, b.at, "%d points where NPOINTS is %d; was the file cut short? Export it again", len(a.y), n)
	}
	x = make([]float64, n)
	for i := range a.y {
		a.y[i] *= scale[1]
		x[i] = (first*float64(n-1-i) + last*float64(i)) / float64(n-1)
	}
	return x, a.y, nil
}

// ordinates decodes lines of ordinates in the codes of the standard:
//
//	AFFN  plain numbers        PAC  numbers set apart by their signs
//	SQZ   @ = 0, A…I = +1…+9, a…i = −1…−9 for sign and first digit
//	DIF   % = 0, J…R = +1…+9, j…r = −1…−9: the difference to the ordinate before
//	DUP   S…Z = 1…8, s = 9: how many times the ordinate or difference stands
//
// A line whose last ordinate is a difference repeats it as the first ordinate of
// the next line, for a check.
type ordinates struct {
	y     []float64
	limit int     // points at most
	dif   bool    // the ordinate before was a difference
	step  float64 // that difference
	msg   string
}

// lineStart is the abscissa that a line begins with and the point it belongs to.
type lineStart struct {
	x     float64
	index int
}

// line decodes one line; msg says what is wrong with it.
func (a *ordinates) line(b []byte) (at lineStart, msg string) {
	x, n := affn(skipSeparators(b))
	if n == 0 {
		return at, "the line does not begin with an abscissa"
	}
	b = skipSeparators(b)[n:]
	at = lineStart{x, len(a.y)}
	check := a.dif && len(a.y) > 0
	if check {
		at.index--
	}
	a.dif = false
	for first := true; ; first = false {
		b = skipSeparators(b)
		if len(b) == 0 {
			return at, ""
		}
		v, kind, n := ordinate(b)
		if n == 0 {
			return at, "\"" + clip(b) + "\" is no ordinate"
		}
		b = b[n:]
		switch {
		case first && check:
			if prev := a.y[len(a.y)-1]; kind != dupCode && kind != difCode && (v == prev || math.IsNaN(v)) {
				continue
			}
			return at, "the check value of the line is not the last ordinate of the line before"
		case !a.take(v, kind):
			return at, a.msg
		}
	}
}

// take appends what one code means.
func (a *ordinates) take(v float64, kind codeKind) bool {
	times := 1
	switch kind {
	case dupCode:
		if len(a.y) == 0 || v < 1 || v > float64(a.limit) {
			a.msg = "a count of repeats that cannot be"
			return false
		}
		times = int(v) - 1
	case difCode:
		if len(a.y) == 0 {
			a.msg = "a difference without an ordinate before it"
			return false
		}
		a.dif, a.step = true, v
	default:
		a.dif = false
		a.y = append(a.y, v)
		times = 0
	}
	if len(a.y)+times > a.limit {
		a.msg = "more points than NPOINTS says"
		return false
	}
	for range times {
		next := a.y[len(a.y)-1]
		if a.dif {
			next += a.step
		}
		a.y = append(a.y, next)
	}
	return true
}

type codeKind uint8

const (
	plainCode codeKind = iota
	difCode
	dupCode
)

// ordinate reads one code at the start of b; n is its length, 0 where there is
// none.
func ordinate(b []byte) (v float64, kind codeKind, n int) {
	c := b[0]
	switch {
	case c == '?':
		return math.NaN(), plainCode, 1
	case c == '@':
		return coded(b, 0, 1, plainCode)
	case c >= 'A' && c <= 'I':
		return coded(b, int(c-'A')+1, 1, plainCode)
	case c >= 'a' && c <= 'i':
		return coded(b, int(c-'a')+1, -1, plainCode)
	case c == '%':
		return coded(b, 0, 1, difCode)
	case c >= 'J' && c <= 'R':
		return coded(b, int(c-'J')+1, 1, difCode)
	case c >= 'j' && c <= 'r':
		return coded(b, int(c-'j')+1, -1, difCode)
	case c >= 'S' && c <= 'Z':
		return coded(b, int(c-'S')+1, 1, dupCode)
	case c == 's':
		return coded(b, 9, 1, dupCode)
	}
	v, n = affn(b)
	return v, plainCode, n
}

// coded reads the digits behind a letter that stands for the first one.
func coded(b []byte, first int, sign float64, kind codeKind) (float64, codeKind, int) {
	n := 1 + leadingDigits(b[1:])
	if n < len(b) && b[n] == '.' {
		n += 1 + leadingDigits(b[n+1:])
	}
	if n > 40 {
		return 0, kind, 0
	}
	text := append([]byte{byte('0' + first)}, b[1:n]...)
	v, ok := parseNumber(text, '.')
	if !ok {
		return 0, kind, 0
	}
	return sign * v, kind, n
}

// affn reads a plain number: sign, digits, point, and an exponent where E is
// followed by a sign, for E alone is a code of +5.
func affn(b []byte) (float64, int) {
	n := 0
	if n < len(b) && (b[n] == '+' || b[n] == '-') {
		n++
	}
	n += leadingDigits(b[n:])
	if n < len(b) && b[n] == '.' {
		n += 1 + leadingDigits(b[n+1:])
	}
	if n+2 < len(b) && b[n] == 'E' && (b[n+1] == '+' || b[n+1] == '-') {
		if d := leadingDigits(b[n+2:]); d > 0 {
			n += 2 + d
		}
	}
	if n > maxNumberBytes {
		return 0, 0
	}
	v, ok := parseNumber(b[:n], '.')
	if !ok {
		return 0, 0
	}
	return v, n
}

// skipSeparators drops what may stand between numbers.
func skipSeparators(b []byte) []byte {
	for len(b) > 0 && (b[0] == ' ' || b[0] == '\t' || b[0] == ',' || b[0] == ';') {
		b = b[1:]
	}
	return b
}
