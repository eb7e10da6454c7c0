package survey

import (
	"errors"
	"maps"
	"slices"
	"strings"
)

// kindsCodec takes words and the kinds that they stand for.
func kindsCodec() codec {
	return codec{
		what: `{WORD = "kind", …} with kinds ` + kindNames(),
		read: func(field, v any) error {
			m, ok := v.(map[string]any)
			if !ok {
				return errRefused
			}
			var kinds map[string]Kind
			for _, word := range slices.Sorted(maps.Keys(m)) {
				kind, ok := m[word].(string)
				if !ok || !slices.Contains(Kinds, Kind(kind)) {
					return errors.New(quote(word) + " must stand for one of " + kindNames())
				}
				low := strings.ToLower(word)
				if _, twice := kinds[low]; twice || word == "" {
					return errors.New(quote(word) + " stands twice, or is empty; the case of letters does not count")
				}
				if kinds == nil {
					kinds = make(map[string]Kind)
				}
				kinds[low] = Kind(kind)
			}
			*field.(*map[string]Kind) = kinds
			return nil
		},
		write: func(field any) string {
			m := *field.(*map[string]Kind)
			var parts []string
			for _, word := range slices.Sorted(maps.Keys(m)) {
				parts = append(parts, tomlKey(word)+" = "+tomlText(string(m[word])))
			}
			return "{" + strings.Join(parts, ", ") + "}"
		},
	}
}

// alertCodec takes contributions by component.
func alertCodec() codec {
	b := bounds{hi: 1e15, open: true}
	return codec{
		what: "{COMPONENT = contribution, …}, each above 0",
		read: func(field, v any) error {
			m, ok := v.(map[string]any)
			if !ok {
				return errRefused
			}
			var alert map[string]float64
			for _, name := range slices.Sorted(maps.Keys(m)) {
				x, ok := b.take(m[name])
				if !ok || name == "" {
					return errors.New(quote(name) + " is " + showValue(m[name]) + " and must be a number above 0")
				}
				if alert == nil {
					alert = make(map[string]float64)
				}
				alert[name] = x
			}
			*field.(*map[string]float64) = alert
			return nil
		},
		write: func(field any) string {
			m := *field.(*map[string]float64)
			var parts []string
			for _, name := range slices.Sorted(maps.Keys(m)) {
				parts = append(parts, tomlKey(name)+" = "+tomlNumber(m[name]))
			}
			return "{" + strings.Join(parts, ", ") + "}"
		},
	}
}
