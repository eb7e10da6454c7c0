package survey

import (
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	"tarnlight/eem"
)

// The codecs of settings that take more than one shape.

// fields returns the values of an inline table that must have exactly these keys.
func fields(v any, keys ...string) ([]any, error) {
	m, ok := v.(map[string]any)
	if !ok {
		return nil, errRefused
	}
	for _, k := range slices.Sorted(maps.Keys(m)) {
		if !slices.Contains(keys, k) {
			return nil, errors.New("it has no key " + quote(k) + didYouMean(k, keys))
		}
	}
	out := make([]any, len(keys))
	for i, k := range keys {
		if out[i], ok = m[k]; !ok {
			return nil, errors.New(k + " is missing")
		}
	}
	return out, nil
}

// numbers takes len(b) numbers, each within its bounds.
func numbers(vs []any, names []string, b ...bounds) ([]float64, error) {
	if len(vs) != len(b) {
		return nil, errRefused
	}
	out := make([]float64, len(b))
	for i := range b {
		x, ok := b[i].take(vs[i])
		if !ok {
			if names == nil {
				return nil, errRefused
			}
			return nil, fmt.Errorf("%s is %s and must be %s", names[i], showValue(vs[i]), b[i].what())
		}
		out[i] = x
	}
	return out, nil
}

// wavelength, nm, from the vacuum ultraviolet, where air absorbs, to the end of
// silicon detectors.
var wavelength = bounds{lo: 150, hi: 1200, unit: "nm"}

func offsetCodec() codec {
	b := bounds{lo: -1e15, hi: 1e15, unit: "counts"}
	return codec{
		what: `a number, counts, or "auto"`,
		read: func(field, v any) error {
			x, ok := b.take(v)
			if v != any("auto") && !ok {
				return errRefused
			}
			*field.(*Offset) = Offset{Auto: !ok, Counts: x}
			return nil
		},
		write: func(field any) string {
			if o := field.(*Offset); !o.Auto {
				return tomlNumber(o.Counts)
			}
			return `"auto"`
		},
	}
}

// stepsCodec takes a list of some of the names, none twice.
func stepsCodec(names []string) codec {
	return codec{
		what: "a list of " + oneOf(names),
		read: func(field, v any) error {
			list, ok := v.([]any)
			if !ok {
				return errRefused
			}
			var steps []string
			for _, e := range list {
				s, ok := e.(string)
				switch {
				case !ok:
					return errRefused
				case !slices.Contains(names, s):
					return errors.New("it holds " + quote(s) + didYouMean(s, names))
				case slices.Contains(steps, s):
					return errors.New("it holds " + quote(s) + " twice")
				}
				steps = append(steps, s)
			}
			*field.(*[]string) = steps
			return nil
		},
		write: func(field any) string {
			var q []string
			for _, s := range *field.(*[]string) {
				q = append(q, tomlText(s))
			}
			return "[" + strings.Join(q, ", ") + "]"
		},
	}
}

func rangeCodec() codec {
	names := []string{"from", "to", "step"}
	return codec{
		what: `{from, to, step} in nm, or "auto"`,
		read: func(field, v any) error {
			if v == any("auto") {
				*field.(**Range) = nil
				return nil
			}
			vs, err := fields(v, names...)
			if err != nil {
				return err
			}
			x, err := numbers(vs, names, wavelength, wavelength, bounds{hi: 1000, open: true, unit: "nm"})
			if err != nil {
				return err
			}
			if _, err := eem.Steps(x[0], x[1], x[2]); err != nil {
				return err
			}
			*field.(**Range) = &Range{From: x[0], To: x[1], Step: x[2]}
			return nil
		},
		write: func(field any) string {
			r := *field.(**Range)
			if r == nil {
				return `"auto"`
			}
			return fmt.Sprintf("{from = %s, to = %s, step = %s}", tomlNumber(r.From), tomlNumber(r.To), tomlNumber(r.Step))
		},
	}
}

// pair takes [from, to] with from < to.
func pair(b bounds) codec {
	return codec{
		what: fmt.Sprintf("[from, to] with from < to, each %s", b.what()),
		read: func(field, v any) error {
			list, ok := v.([]any)
			if !ok {
				return errRefused
			}
			x, err := numbers(list, nil, b, b)
			if err != nil || !(x[0] < x[1]) {
				return errRefused
			}
			*field.(*[2]float64) = [2]float64{x[0], x[1]}
			return nil
		},
		write: func(field any) string {
			p := *field.(*[2]float64)
			return "[" + tomlNumber(p[0]) + ", " + tomlNumber(p[1]) + "]"
		},
	}
}

// windowCodec takes a window of the cell, or "centre", which is the zero window.
func windowCodec() codec {
	p := pair(bounds{lo: 0, hi: 10, unit: "cm"})
	return codec{
		what: p.what + `, or "centre"`,
		read: func(field, v any) error {
			if v == any("centre") {
				*field.(*[2]float64) = [2]float64{}
				return nil
			}
			return p.read(field, v)
		},
		write: func(field any) string {
			if *field.(*[2]float64) == [2]float64{} {
				return `"centre"`
			}
			return p.write(field)
		},
	}
}

func temperatureCodec() codec {
	names := []string{"reference_c", "percent_per_c"}
	return codec{
		what: `"off" or {reference_c, percent_per_c}: °C and % of the fluorescence lost per °C`,
		read: func(field, v any) error {
			if v == any("off") {
				*field.(*Temperature) = Temperature{}
				return nil
			}
			vs, err := fields(v, names...)
			if err != nil {
				return err
			}
			x, err := numbers(vs, names, bounds{lo: -5, hi: 100, unit: "°C"}, bounds{lo: -10, hi: 10, unit: "% per °C"})
			if err != nil {
				return err
			}
			*field.(*Temperature) = Temperature{On: true, ReferenceC: x[0], PercentPerC: x[1]}
			return nil
		},
		write: func(field any) string {
			t := field.(*Temperature)
			if !t.On {
				return `"off"`
			}
			return fmt.Sprintf("{reference_c = %s, percent_per_c = %s}", tomlNumber(t.ReferenceC), tomlNumber(t.PercentPerC))
		},
	}
}

// bandCodec takes the widths of a band; "auto" keeps the stated default widths
// beside it, which hold where nothing can be found. A Raman band may also be given
// as a stretch of shifts, cm⁻¹, which widens with the excitation as the line does;
// below and above are then taken from its ends.
func bandCodec(b Band, raman bool) codec {
	below, above := b.Below, b.Above
	what := `{below, above} in nm, 0 to 300 each, "auto" or "off"`
	if raman {
		what = `{below, above} in nm, 0 to 300 each, the same with {from_cm, to_cm} in cm⁻¹, "auto" or "off"`
	}
	return codec{
		what: what,
		read: func(field, v any) error {
			switch v {
			case any("auto"):
				*field.(*Band) = Band{Below: below, Above: above, Auto: true}
				return nil
			case any("off"):
				*field.(*Band) = Band{Off: true}
				return nil
			}
			b, err := readBand(v, raman)
			if err == nil {
				*field.(*Band) = b
			}
			return err
		},
		write: func(field any) string {
			b := field.(*Band)
			switch {
			case b.Off:
				return `"off"`
			case b.Auto:
				return `"auto"`
			case b.ToCM > 0:
				return fmt.Sprintf("{below = %s, above = %s, from_cm = %s, to_cm = %s}",
					tomlNumber(b.Below), tomlNumber(b.Above), tomlNumber(b.FromCM), tomlNumber(b.ToCM))
			}
			return fmt.Sprintf("{below = %s, above = %s}", tomlNumber(b.Below), tomlNumber(b.Above))
		},
	}
}

// readBand takes the widths of a band, those of a Raman band with or without shifts.
func readBand(v any, raman bool) (Band, error) {
	names := []string{"below", "above"}
	width, shift := bounds{hi: 300, unit: "nm"}, bounds{lo: 1, hi: 10_000, unit: "cm⁻¹"}
	within := []bounds{width, width}
	if m, ok := v.(map[string]any); ok && raman && (m["from_cm"] != nil || m["to_cm"] != nil) {
		names, within = append(names, "from_cm", "to_cm"), append(within, shift, shift)
	}
	vs, err := fields(v, names...)
	if err != nil {
		return Band{}, err
	}
	x, err := numbers(vs, names, within...)
	if err != nil {
		return Band{}, err
	}
	b := Band{Below: x[0], Above: x[1]}
	if len(x) > 2 {
		if b.FromCM, b.ToCM = x[2], x[3]; !(b.FromCM < b.ToCM) {
			return Band{}, errors.New("from_cm must be below to_cm")
		}
	}
	return b, nil
}
