package survey

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"
)

// tomlNumber writes x so that reading gives the same bits.
func tomlNumber(x float64) string {
	if a := math.Abs(x); a == 0 || (a >= 1e-4 && a < 1e15) {
		return strconv.FormatFloat(x, 'f', -1, 64)
	}
	return strconv.FormatFloat(x, 'e', -1, 64)
}

// tomlText writes s as a basic string.
func tomlText(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r == '\n':
			b.WriteString(`\n`)
		case r == '\t':
			b.WriteString(`\t`)
		case r < ' ' || r == 0x7f:
			fmt.Fprintf(&b, `\u%04X`, r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// tomlKey writes a key bare where TOML allows it.
func tomlKey(s string) string {
	bare := func(r rune) bool {
		return r < 128 && (unicode.IsLetter(r) || unicode.IsDigit(r) || r == '-' || r == '_')
	}
	if s != "" && strings.IndexFunc(s, func(r rune) bool { return !bare(r) }) < 0 {
		return s
	}
	return tomlText(s)
}

// showValue writes a decoded value for a message, shortened.
func showValue(v any) string {
	switch x := v.(type) {
	case string:
		return quote(x)
	case map[string]any:
		return "{" + strings.Join(sortedKeys(x), ", ") + "}"
	case []any:
		if len(x) > 6 {
			return fmt.Sprintf("a list of %d values", len(x))
		}
		s := make([]string, len(x))
		for i := range x {
			s[i] = showValue(x[i])
		}
		return "[" + strings.Join(s, ", ") + "]"
	default:
		return strings.ToLower(fmt.Sprint(x))
	}
}

// sortedKeys returns the first few keys of a map, sorted, shortened for messages.
func sortedKeys(m map[string]any) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	if len(keys) > 6 {
		keys = append(keys[:6], "…")
	}
	for i, k := range keys {
		if len(k) > shown {
			keys[i] = quote(k)
		}
	}
	return keys
}
