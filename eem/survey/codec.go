package survey

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"
)

// codec moves one setting between TOML and its field. field is a pointer into
// Settings; v is a value as go-toml decodes it (string, int64, float64, bool,
// []any, map[string]any). read leaves the field alone when it returns an error,
// whose text, often empty, says more than "not allowed". write returns TOML that
// read takes back.
type codec struct {
	what  string // type and what is allowed, for messages and `settings --list`
	read  func(field, v any) error
	write func(field any) string
}

// errRefused refuses a value without saying more than what is allowed.
var errRefused = errors.New("")

// text takes any text of one line.
func text(what string) codec {
	return codec{
		what: what,
		read: func(field, v any) error {
			s, ok := v.(string)
			if !ok {
				return errRefused
			}
			if i := strings.IndexFunc(s, unicode.IsControl); i >= 0 {
				return fmt.Errorf(`it holds the control character %+q (write \ in paths as / or put the path in single quotes)`, []rune(s[i:])[0])
			}
			*field.(*string) = s
			return nil
		},
		write: func(field any) string { return tomlText(*field.(*string)) },
	}
}

// lines takes text of several lines.
func lines(what string) codec {
	c := text(what)
	c.read = func(field, v any) error {
		s, ok := v.(string)
		if !ok {
			return errRefused
		}
		s = strings.ReplaceAll(s, "\r\n", "\n")
		for _, r := range s {
			if unicode.IsControl(r) && r != '\n' && r != '\t' {
				return fmt.Errorf("it holds the control character %+q", r)
			}
		}
		*field.(*string) = s
		return nil
	}
	return c
}

// choice takes one of some words.
func choice(names ...string) codec {
	return codec{
		what: oneOf(names),
		read: func(field, v any) error {
			s, ok := v.(string)
			if !ok {
				return errRefused
			}
			if !slices.Contains(names, s) {
				return hint(strings.TrimPrefix(didYouMean(s, names), "; "))
			}
			*field.(*string) = s
			return nil
		},
		write: func(field any) string { return tomlText(*field.(*string)) },
	}
}

// unitWords are how laboratories write the units of intensity, by ours.
var unitWords = map[string]string{"a.u.": "counts", "au": "counts", "a.u": "counts", "arbitrary": "counts", "cps": "counts", "ru": "raman", "r.u.": "raman",
	"qsu": "quinine", "qse": "quinine", "ppb": "quinine", "nm-1": "raman"}

// unitCodec is a choice of units that knows how else they are written.
func unitCodec(names ...string) codec {
	c := choice(names...)
	read := c.read
	c.read = func(field, v any) error {
		err := read(field, v)
		if s, ok := v.(string); err != nil && ok {
			if w := unitWords[strings.ToLower(strings.TrimSpace(s))]; w != "" {
				return hint("did you mean " + quote(w) + "?")
			}
		}
		return err
	}
	return c
}

// bounds are those of a finite number, lo itself excluded when open.
type bounds struct {
	lo, hi float64
	open   bool
	unit   string
}

func (b bounds) what() string {
	s := "a number"
	switch {
	case b.open && math.IsInf(b.hi, 1):
		s += " above " + tomlNumber(b.lo)
	case b.open:
		s += " above " + tomlNumber(b.lo) + " and up to " + tomlNumber(b.hi)
	case math.IsInf(b.hi, 1):
		s += " of " + tomlNumber(b.lo) + " or more"
	default:
		s += " from " + tomlNumber(b.lo) + " to " + tomlNumber(b.hi)
	}
	if b.unit != "" {
		s += ", " + b.unit
	}
	return s
}

// take returns v as a number within the bounds.
func (b bounds) take(v any) (float64, bool) {
	var x float64
	switch n := v.(type) {
	case int64:
		x = float64(n)
	case float64:
		x = n
	default:
		return 0, false
	}
	if math.IsNaN(x) || math.IsInf(x, 0) || x < b.lo || x > b.hi || (b.open && x == b.lo) {
		return 0, false
	}
	return x + 0, true // −0 becomes 0
}

// number takes a number within bounds.
func number(b bounds) codec {
	return codec{
		what: b.what(),
		read: func(field, v any) error {
			x, ok := b.take(v)
			if !ok {
				return errRefused
			}
			*field.(*float64) = x
			return nil
		},
		write: func(field any) string { return tomlNumber(*field.(*float64)) },
	}
}

// whole takes a whole number from lo to hi.
func whole(lo, hi int) codec {
	return codec{
		what: fmt.Sprintf("a whole number from %d to %d", lo, hi),
		read: func(field, v any) error {
			n, ok := v.(int64)
			if !ok || n < int64(lo) || n > int64(hi) {
				return errRefused
			}
			*field.(*int) = int(n)
			return nil
		},
		write: func(field any) string { return strconv.Itoa(*field.(*int)) },
	}
}

// seed takes a whole number that starts a random generator. TOML has no whole
// numbers above 2⁶³ − 1.
func seed() codec {
	return codec{
		what: "a whole number of 0 or more",
		read: func(field, v any) error {
			n, ok := v.(int64)
			if !ok || n < 0 {
				return errRefused
			}
			*field.(*uint64) = uint64(n)
			return nil
		},
		write: func(field any) string { return strconv.FormatUint(*field.(*uint64)&math.MaxInt64, 10) },
	}
}

// boolean takes true or false.
func boolean() codec {
	return codec{
		what: "true or false",
		read: func(field, v any) error {
			b, ok := v.(bool)
			if !ok {
				return errRefused
			}
			*field.(*bool) = b
			return nil
		},
		write: func(field any) string { return strconv.FormatBool(*field.(*bool)) },
	}
}

// hint makes an error of a text, errRefused of none.
func hint(s string) error {
	if s == "" {
		return errRefused
	}
	return errors.New(s)
}

// oneOf lists words: "a", "b" or "c".
func oneOf(names []string) string {
	q := make([]string, len(names))
	for i, n := range names {
		q[i] = `"` + n + `"`
	}
	if len(q) < 2 {
		return strings.Join(q, "")
	}
	return strings.Join(q[:len(q)-1], ", ") + " or " + q[len(q)-1]
}

func isControl(r rune) bool { return unicode.IsControl(r) }
