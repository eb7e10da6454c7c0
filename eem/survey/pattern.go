package survey

import (
	"errors"
	"slices"
	"strings"

	"tarnlight/eem/scanfile"
)

// pattern takes a pattern of eem/scanfile that holds the placeholder {name}, or
// nothing.
func pattern(name string) codec {
	c := text("a pattern with {" + name + "}")
	read := c.read
	c.read = func(field, v any) error {
		var s string
		if err := read(&s, v); err != nil {
			return err
		}
		if s != "" {
			if _, err := scanfile.CompilePattern(s); err != nil {
				return err
			}
			if !strings.Contains(s, "{"+name+"}") {
				return errors.New("{" + name + "} is missing")
			}
		}
		*field.(*string) = s
		return nil
	}
	return c
}

// patternsCodec takes a list of patterns of eem/scanfile.
func patternsCodec() codec {
	return codec{
		what: `a list of patterns of names, such as ["*.pdf", "old/*"]`,
		read: func(field, v any) error {
			list, ok := v.([]any)
			if !ok {
				return errRefused
			}
			var out []string
			for _, e := range list {
				s, ok := e.(string)
				if !ok {
					return errRefused
				}
				if _, err := scanfile.CompilePattern(s); err != nil {
					return err
				}
				if strings.Trim(s, "*/.") == "" {
					return errors.New(quote(s) + " is every file")
				}
				if slices.Contains(out, s) {
					return errors.New("it holds " + quote(s) + " twice")
				}
				out = append(out, s)
			}
			*field.(*[]string) = out
			return nil
		},
		write: func(field any) string {
			q := make([]string, len(*field.(*[]string)))
			for i, s := range *field.(*[]string) {
				q[i] = tomlText(s)
			}
			return "[" + strings.Join(q, ", ") + "]"
		},
	}
}

// Ignored says of paths, relative to the root and with slashes, whether [sheet]
// ignore names them or a folder above them.
func (s *SheetSettings) Ignored() func(path string) bool {
	var all []*scanfile.Pattern
	for _, text := range s.Ignore {
		if p, err := scanfile.CompilePattern(strings.TrimSuffix(text, "/")); err == nil { // settings that were read hold no other
			all = append(all, p)
		}
	}
	return func(path string) bool {
		for len(all) > 0 {
			if slices.ContainsFunc(all, func(p *scanfile.Pattern) bool { _, ok := p.Match(path); return ok }) {
				return true
			}
			i := strings.LastIndexByte(path, '/')
			if i < 0 {
				return false
			}
			path = path[:i]
		}
		return false
	}
}
