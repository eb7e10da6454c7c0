package survey

import (
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	"tarnlight/eem"
)

// maxComponents is more than anyone has told apart in an EEM survey, and keeps a
// slip of the finger from running for days.
const maxComponents = 20

func componentsCodec() codec {
	auto := Default().Resolve.Components
	return codec{
		what: fmt.Sprintf(`"auto", "off", a whole number, or [from, to], each from 1 to %d`, maxComponents),
		read: func(field, v any) error {
			c := Components{Mode: "range"}
			list, isList := v.([]any)
			switch {
			case v == any("auto"):
				c = auto
			case v == any("off"):
				c = Components{Mode: "off"}
			case !isList:
				list = []any{v, v}
				fallthrough
			default:
				x, err := numbers(list, nil, bounds{lo: 1, hi: maxComponents}, bounds{lo: 1, hi: maxComponents})
				if err != nil {
					return err
				}
				if c.From, c.To = int(x[0]), int(x[1]); float64(c.From) != x[0] || float64(c.To) != x[1] || c.From > c.To {
					return errRefused
				}
			}
			*field.(*Components) = c
			return nil
		},
		write: func(field any) string {
			c := field.(*Components)
			switch {
			case c.Mode != "range":
				return tomlText(c.Mode)
			case c.From == c.To:
				return fmt.Sprint(c.From)
			}
			return fmt.Sprintf("[%d, %d]", c.From, c.To)
		},
	}
}

func referencesCodec() codec {
	words := []string{"auto", "standards", "none"}
	return codec{
		what: `"auto", "standards", "none" or {file = "…"}`,
		read: func(field, v any) error {
			q := field.(*Quantify)
			if s, ok := v.(string); ok {
				if !slices.Contains(words, s) {
					return hint(strings.TrimPrefix(didYouMean(s, words), "; "))
				}
				q.References, q.File = s, ""
				return nil
			}
			vs, err := fields(v, "file")
			if err != nil {
				return err
			}
			var file string
			if err := text("").read(&file, vs[0]); err != nil || file == "" {
				return errors.New("file must name a file")
			}
			q.References, q.File = "file", file
			return nil
		},
		write: func(field any) string {
			if q := field.(*Quantify); q.References != "file" {
				return tomlText(q.References)
			}
			return "{file = " + tomlText(field.(*Quantify).File) + "}"
		},
	}
}

// declaredCodec takes a number that may stay unsaid.
func declaredCodec(b bounds) codec {
	const none = "not given"
	return codec{
		what: b.what() + `, or "` + none + `"`,
		read: func(field, v any) error {
			x, ok := b.take(v)
			if v != any(none) && !ok {
				return errRefused
			}
			*field.(*Declared) = Declared{Given: ok, Value: x}
			return nil
		},
		write: func(field any) string {
			if d := field.(*Declared); d.Given {
				return tomlNumber(d.Value)
			}
			return tomlText(none)
		},
	}
}

// limitCodec takes the limit of one test; its field is the map of all limits.
func limitCodec(t eem.Test) codec {
	b := bounds{lo: 0, hi: 1e9, unit: t.Unit}
	return codec{
		what: b.what(),
		read: func(field, v any) error {
			x, ok := b.take(v)
			if !ok {
				return errRefused
			}
			m := field.(*map[string]float64)
			if *m == nil {
				*m = make(map[string]float64)
			}
			(*m)[t.Code] = x
			return nil
		},
		write: func(field any) string {
			if x, ok := (*field.(*map[string]float64))[t.Code]; ok {
				return tomlNumber(x)
			}
			return tomlNumber(t.Limit)
		},
	}
}

func acceptCodec() codec {
	return codec{
		what: `{CODE = "reason", …} with codes of ` + "`tarnlight tests --list`",
		read: func(field, v any) error {
			m, ok := v.(map[string]any)
			if !ok {
				return errRefused
			}
			var accept map[string]string
			for _, code := range slices.Sorted(maps.Keys(m)) {
				if err := acceptable(code, m[code]); err != nil {
					return err
				}
				if accept == nil {
					accept = make(map[string]string)
				}
				accept[code] = m[code].(string)
			}
			*field.(*map[string]string) = accept
			return nil
		},
		write: func(field any) string {
			m := *field.(*map[string]string)
			var parts []string
			for _, code := range slices.Sorted(maps.Keys(m)) {
				parts = append(parts, tomlKey(code)+" = "+tomlText(m[code]))
			}
			return "{" + strings.Join(parts, ", ") + "}"
		},
	}
}

// acceptable says why a doubt cannot be accepted for the reason v.
func acceptable(code string, v any) error {
	t, ok := eem.FindTest(code)
	if !ok {
		return errors.New("there is no test " + quote(code) + didYouMean(code, testCodes()))
	}
	if t.Severity == eem.Reject {
		return fmt.Errorf("%s makes a number unusable and cannot be accepted; give the bottle a reason in the column exclude", code)
	}
	if s, ok := v.(string); !ok || strings.TrimSpace(s) == "" || strings.ContainsFunc(s, isControl) {
		return fmt.Errorf(`%s needs a reason in words: accept = {%s = "…"}`, code, code)
	}
	return nil
}

func testCodes() []string {
	codes := make([]string, len(eem.Tests))
	for i, t := range eem.Tests {
		codes[i] = t.Code
	}
	return codes
}

// measureCodec takes text, or a number that is then given its unit.
func measureCodec(unit string) codec {
	c := text("text with its unit, or a number, " + unit)
	read := c.read
	c.read = func(field, v any) error {
		if x, ok := (bounds{hi: 1e6, open: true}).take(v); ok {
			v = tomlNumber(x) + " " + unit
		}
		return read(field, v)
	}
	return c
}
