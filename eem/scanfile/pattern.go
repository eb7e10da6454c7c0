package scanfile

import "errors"

// Pattern finds parts of a file name. Its text is literal (letters in either
// case) except for placeholders:
//
//	{nm}    a wavelength: digits with an optional decimal part (350, 350.5, 350,5)
//	{id}    an id: one or more characters, none of them /
//	{kind}  a word of letters and hyphens
//	{date}  2026-05-03, 20260503 or 2026_05_03; reported as 2026-05-03
//	{n}     a whole number
//	*       anything, also nothing, but no /
//
// Each placeholder may stand once.
type Pattern struct {
	text string
}

// CompilePattern checks and compiles a pattern.
func CompilePattern(s string) (*Pattern, error) { return nil, errors.New("pattern: not written yet") }

// Match matches the whole name: the last path element, as many elements as the
// pattern has, with or without its extension. It returns the text of each
// placeholder by its name, without braces.
func (p *Pattern) Match(name string) (map[string]string, bool) { return nil, false }

// String returns the pattern's text.
func (p *Pattern) String() string { return p.text }
