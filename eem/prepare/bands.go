package prepare

import (
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/eem/survey"
)

// bandKey is one band of the settings.
type bandKey struct {
	key    string // of [scatter]
	of     func(*survey.Scatter) *survey.Band
	line   scatter.Line
	reason eem.Reason
	window float64 // nm, in which its ridges are looked for
}

var bandKeys = []bandKey{
	{"rayleigh.first", func(s *survey.Scatter) *survey.Band { return &s.Rayleigh.First }, scatter.Rayleigh1, eem.Rayleigh1, rayleighWindow},
	{"raman.first", func(s *survey.Scatter) *survey.Band { return &s.Raman.First }, scatter.Raman1, eem.Raman1, ramanWindow},
	{"rayleigh.second", func(s *survey.Scatter) *survey.Band { return &s.Rayleigh.Second }, scatter.Rayleigh2, eem.Rayleigh2, 2 * rayleighWindow},
	{"raman.second", func(s *survey.Scatter) *survey.Band { return &s.Raman.Second }, scatter.Raman2, eem.Raman2, 2 * ramanWindow},
}

// Bands returns the bands that the settings remove, first order first.
func Bands(s survey.Scatter) []scatter.Band {
	var out []scatter.Band
	for _, k := range bandKeys {
		if b := k.of(&s); !b.Off {
			out = append(out, scatter.Band{Line: k.line, Below: b.Below, Above: b.Above, From: b.FromCM, To: b.ToCM, Reason: k.reason})
		}
	}
	return out
}

// Line is a scatter line of a bottle and what its settings do about it.
type Line struct {
	scatter.Band        // what is taken out, or by default would be
	Key          string // of [scatter]
	Off          bool   // nothing is taken out
}

// Lines returns the scatter lines of a bottle, first order first, and whether their
// bands were taken out here.
func (b *Bottle) Lines() (out []Line, here bool) {
	def := survey.Default().Scatter
	for _, k := range bandKeys {
		band := *k.of(&b.Setting.Scatter)
		off := band.Off
		if off {
			band = *k.of(&def)
		}
		out = append(out, Line{scatter.Band{Line: k.line, Below: band.Below, Above: band.Above, From: band.FromCM, To: band.ToCM, Reason: k.reason}, k.key, off})
	}
	return out, !b.skips(stepScatter)
}

// findBands puts the widths found on the blanks in the place of "auto". All
// bottles of a survey get the same bands, the widest of any batch, so that on one
// grid they lack the same cells; with the settings in force they go into the
// model.
func (s *Survey) findBands() {
	found := map[string]survey.Band{}
	for _, k := range bandKeys {
		if !s.wantsAuto(k) {
			continue
		}
		b, ok := s.widest(k)
		if !ok {
			def := survey.Default().Scatter
			b = *k.of(&def)
			s.defaultBands = append(s.defaultBands, k.key)
			s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "band-default", Severity: eem.Remark,
				Msg: fmt.Sprintf("no blank shows the ridge of %s at three excitations whole; its band is the default, %g nm below and %g nm above", k.line, b.Below, b.Above)}), "", ""))
		}
		found[k.key] = b
	}
	if len(found) == 0 {
		return
	}
	s.autoBands = found
	s.setBands(&s.Settings.Scatter)
	s.Settings.Setups = maps.Clone(s.Settings.Setups)
	for name, u := range s.Settings.Setups {
		s.Settings.Setups[name] = withBands(u, found)
	}
	for _, b := range s.Bottles {
		if b.Row.Setup != "" {
			s.setBands(&b.Setting.Scatter) // a copy of the row's own
		}
	}
}

// wantsAuto says whether any bottle that takes part asks for the band's width.
func (s *Survey) wantsAuto(k bandKey) bool {
	for _, b := range s.Bottles {
		if !b.Excluded && !b.skips(stepScatter) && k.of(&b.Setting.Scatter).Auto {
			return true
		}
	}
	return false
}

// widest is the widest band that the blanks of any batch ask for.
func (s *Survey) widest(k bandKey) (survey.Band, bool) {
	var out survey.Band
	any := false
	for _, bt := range s.Batches {
		var ps []scatter.Peak
		for _, b := range bt.Blanks {
			if b.rawLight() {
				ps = append(ps, scatter.Ridge(b.raw, k.line, k.window)...)
			}
		}
		find := scatter.AutoBand
		if k.line.Shift > 0 {
			find = scatter.AutoShifts
		}
		b, ok := find(ps, k.line, k.reason)
		if !ok {
			continue
		}
		any = true
		out.Below, out.Above = max(out.Below, b.Below), max(out.Above, b.Above)
		out.FromCM, out.ToCM = b.From, b.To
	}
	return out, any
}

// setBands replaces every "auto" by what was found.
func (s *Survey) setBands(set *survey.Scatter) {
	for _, k := range bandKeys {
		if b, ok := s.autoBands[k.key]; ok && k.of(set).Auto {
			*k.of(set) = b
		}
	}
}

// withBands is a setup whose overrides hold what was found.
func withBands(u *survey.Setup, found map[string]survey.Band) *survey.Setup {
	out := *u
	out.Set = nil
	for _, o := range u.Set {
		if b, ok := found[strings.TrimPrefix(o.Key, "scatter.")]; ok && o.Value == `"auto"` {
			o.Value = bandTOML(b)
		}
		out.Set = append(out.Set, o)
	}
	return &out
}

func bandTOML(b survey.Band) string {
	num := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	s := "{below = " + num(b.Below) + ", above = " + num(b.Above)
	if b.ToCM > 0 {
		s += ", from_cm = " + num(b.FromCM) + ", to_cm = " + num(b.ToCM)
	}
	return s + "}"
}

// sourceOfBands says in the record of the mask which widths were found.
func (s *Survey) sourceOfBands(e *eem.EEM) {
	n := &e.Notes[len(e.Notes)-1]
	for i, p := range n.Params {
		for _, k := range bandKeys {
			if _, ok := s.autoBands[k.key]; ok && !slices.Contains(s.defaultBands, k.key) && p.Source == "settings" && strings.HasPrefix(p.Name, k.reason.String()+",") {
				n.Params[i].Source = "ridges of the blanks (" + "scatter." + k.key + " = \"auto\")"
			}
		}
	}
}
