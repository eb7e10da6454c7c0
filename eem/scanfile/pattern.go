package scanfile

import (
	"fmt"
	"path"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode"
)

// Pattern finds parts of a file name. Its text is literal (letters in either
// case) except for placeholders:
//
//	{nm}    a wavelength: digits with an optional decimal part (350, 350.5, 350,5)
//	{id}    an id: one or more characters, none of them /, as many as fit
//	{kind}  a word of letters and hyphens
//	{date}  2026-05-03, 20260503 or 2026_05_03; reported as 2026-05-03
//	{n}     a whole number
//	{dilution}  a dilution factor: digits with an optional decimal part
//	*       anything, also nothing, but no /
//
// Each placeholder may stand once.
type Pattern struct {
	text  string
	names []string       // placeholders by the number of their group, from 1
	whole *regexp.Regexp // anchored at both ends
	part  *regexp.Regexp // anywhere
}

// placeholders gives what each one matches.
var placeholders = map[string]string{
	"nm":       `[0-9]{2,6}(?:[.,][0-9]+)?`,
	"id":       `[^/]+`,
	"kind":     `[\p{L}-]+`,
	"date":     `[0-9]{4}-[0-9]{2}-[0-9]{2}|[0-9]{4}_[0-9]{2}_[0-9]{2}|[0-9]{8}`,
	"n":        `[0-9]+`,
	"dilution": `[0-9]{1,6}(?:[.,][0-9]+)?`,
}

// maxPatternBytes bounds a pattern; no file name is longer.
const maxPatternBytes = 255

// CompilePattern checks and compiles a pattern.
func CompilePattern(s string) (*Pattern, error) {
	if s == "" || len(s) > maxPatternBytes {
		return nil, fmt.Errorf("pattern %.40q has %d bytes; write 1 to %d, for example {id}_ex{nm}", s, len(s), maxPatternBytes)
	}
	p := &Pattern{text: s}
	var re strings.Builder
	for rest := s; rest != ""; {
		i := strings.IndexAny(rest, "{}*")
		if i < 0 {
			i = len(rest)
		}
		re.WriteString(regexp.QuoteMeta(rest[:i]))
		if rest = rest[i:]; rest == "" {
			break
		}
		if rest[0] == '*' {
			re.WriteString(`[^/]*`)
			rest = rest[1:]
			continue
		}
		name, after, ok := strings.Cut(rest[1:], "}")
		if what := placeholders[name]; rest[0] == '}' || !ok || what == "" {
			return nil, fmt.Errorf("pattern %q: %q is no placeholder; there are {nm}, {id}, {kind}, {date}, {n}, {dilution} and *", s, rest[:len(rest)-len(after)])
		} else if slices.Contains(p.names, name) {
			return nil, fmt.Errorf("pattern %q: {%s} stands twice; use * for the part that does not matter", s, name)
		} else {
			re.WriteString("(" + what + ")")
		}
		p.names = append(p.names, name)
		rest = after
	}
	var err error
	if p.whole, err = regexp.Compile(`(?is)^` + re.String() + `$`); err != nil {
		return nil, fmt.Errorf("pattern %q: %w", s, err)
	}
	p.part, err = regexp.Compile(`(?is)` + re.String())
	return p, err
}

// Match matches the whole name: its last path element, or as many elements as
// the pattern has, without the extension or with it. It returns the text of each
// placeholder by its name, without braces.
func (p *Pattern) Match(name string) (map[string]string, bool) {
	name = lastElements(filepath.ToSlash(name), 1+strings.Count(p.text, "/"))
	for _, try := range []string{stem(name), name} {
		if m := p.whole.FindStringSubmatch(try); m != nil {
			if got, ok := p.values(m); ok {
				return got, true
			}
		}
	}
	return nil, false
}

// Has says whether the pattern has the placeholder {name}.
func (p *Pattern) Has(name string) bool { return slices.Contains(p.names, name) }

// String returns the pattern's text.
func (p *Pattern) String() string { return p.text }

// nm finds the pattern anywhere in text and returns its wavelength.
func (p *Pattern) nm(text string) (float64, bool) {
	m := p.part.FindStringSubmatch(text)
	if m == nil {
		return 0, false
	}
	i := slices.Index(p.names, "nm")
	v, err := strconv.ParseFloat(strings.Replace(m[i+1], ",", ".", 1), 64)
	return v, err == nil
}

func (p *Pattern) values(m []string) (map[string]string, bool) {
	got := make(map[string]string, len(p.names))
	for i, name := range p.names {
		v := m[i+1]
		switch name {
		case "nm", "dilution":
			v = strings.Replace(v, ",", ".", 1)
		case "date":
			t, err := time.Parse("20060102", strings.NewReplacer("-", "", "_", "").Replace(v))
			if err != nil {
				return nil, false
			}
			v = t.Format(time.DateOnly)
		}
		got[name] = v
	}
	return got, true
}

// stem returns a name without its extension: a point and what follows it when
// that has a letter, so that ex350.5 stays whole.
func stem(name string) string {
	ext := path.Ext(name)
	if len(ext) > 1 && strings.IndexFunc(ext, unicode.IsLetter) >= 0 {
		return name[:len(name)-len(ext)]
	}
	return name
}

// lastElements returns the last n elements of a slash-separated path.
func lastElements(name string, n int) string {
	i := len(name)
	for ; n > 0 && i >= 0; n-- {
		i = strings.LastIndexByte(name[:i], '/')
	}
	return name[i+1:]
}
