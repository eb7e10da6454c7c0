package survey

import (
	"errors"
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
