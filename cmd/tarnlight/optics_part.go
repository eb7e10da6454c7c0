package main

import (
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// opticsNames maps the columns of samples.csv to the indices.
var opticsNames = map[string]string{"suva254": "suva254", "slope_275_295": "s_275_295", "slope_350_400": "s_350_400", "slope_ratio": "s_r",
	"absorbance_250_365": "e2_e3", "fluorescence_index": "fi_470_520", "biological_index": "bix", "humification_index": "hix_sum", "humification_ratio": "hix_ratio", "freshness_index": "freshness",
	"peak_b": "peak_b", "peak_t": "peak_t", "peak_a": "peak_a", "peak_m": "peak_m", "peak_c": "peak_c",
	"quantum_yield": "quantum_yield", "absorption_254": "a254", "absorption_350": "a350", "absorption_440": "a440", "aromaticity": "aromaticity",
	"absorbance_465_665": "e4_e6", "fluorescence_index_first": "fi_450_500", "freshness_boxes": "freshness_boxes",
	"region_1": "region_1", "region_2": "region_2", "region_3": "region_3", "region_4": "region_4", "region_5": "region_5"}

// indices returns the indices of a usable bottle's water, computed once.
func (j *job) indices(b *prepare.Bottle) []optics.Index {
	if list, ok := j.optics[b]; ok || !b.Usable() {
		return list
	}
	list := append(optics.Fluorescence(b.EEM), optics.Regions(b.EEM)...)
	if o := j.set.Optics; o.YieldStandard != "" {
		list = append(list, j.quantumYield(b))
	}
	if b.Absorb != nil {
		list = append(list, optics.Absorption(b.Absorb, b.Row.DOC)...)
	}
	if j.optics == nil {
		j.optics = map[*prepare.Bottle][]optics.Index{}
	}
	j.optics[b] = list
	return list
}

func (j *job) opticsColumns(set func(string, any), b *prepare.Bottle) {
	flat := optics.Flat(j.indices(b))
	for column, name := range opticsNames {
		if v, ok := flat[name]; ok {
			set(column, v)
		}
	}
}

// opticsFlags tells, once for the survey, which fluorescence indices are refused
// and why. What the sheet does not give (absorbance, carbon) is no refusal.
func (j *job) opticsFlags() []eem.Flag {
	type refusal struct {
		name, id, why string
		n             int
	}
	var list []*refusal
	at := map[string]*refusal{}
	bottles := 0
	for _, b := range j.sv.Bottles {
		if !b.Usable() || b.Row.Kind != survey.Sample {
			continue
		}
		bottles++
		for _, ix := range j.indices(b) {
			column, fluorescent := listed(ix.Name)
			if ix.Refused == "" || !fluorescent {
				continue
			}
			r := at[ix.Name]
			if r == nil {
				r = &refusal{name: column, id: b.Row.ID, why: ix.Refused}
				at[ix.Name] = r
				list = append(list, r)
			}
			r.n++
		}
	}
	if len(list) == 0 {
		return j.yieldFlags()
	}
	var words []string
	for _, r := range list {
		words = append(words, fmt.Sprintf("%s for %d of %s (%s: %s)", r.name, r.n, eem.Count(bottles, "sample"), r.id, r.why))
	}
	return append(j.yieldFlags(), j.sv.Accept(eem.Flag{Test: "index-refused", Severity: eem.Remark, Value: float64(len(list)), Limit: nan,
		Msg: "indices not given: " + strings.Join(words, "; ")}))
}

// listed returns the column of an index in samples.csv, and whether it rests on
// fluorescence.
func listed(name string) (column string, fluorescent bool) {
	for c, n := range opticsNames {
		if n == name {
			return c, !strings.HasPrefix(c, "abs") && !slices.Contains(absorbing, name)
		}
	}
	return "", false
}

// absorbing are the other indices that rest on absorbance alone.
var absorbing = []string{"suva254", "aromaticity", "s_275_295", "s_350_400", "s_r"}

// quantumYield is the apparent quantum yield of a bottle against the standard of the
// settings.
func (j *job) quantumYield(b *prepare.Bottle) optics.Index {
	o := j.set.Optics
	refuse := func(why string) optics.Index {
		return optics.Index{Name: "quantum_yield", Value: nan, U: nan, Refused: why}
	}
	std := j.bottle(o.YieldStandard)
	if std == nil || !std.Usable() {
		return refuse("yield standard " + o.YieldStandard + " cannot be used")
	}
	x, why := j.emitter(b)
	if why != "" {
		return refuse(why)
	}
	s, why := j.emitter(std)
	if why != "" {
		return refuse("yield standard " + o.YieldStandard + ": " + why)
	}
	return optics.YieldIndex(x, optics.YieldStandard{Emitter: s, Yield: o.Yield.Value, Refractive: o.RefractiveIndex, Source: o.YieldSource}, o.ExcitationNM, o.WindowNM)
}

// emitter is a bottle as a yield needs it; why says what it lacks.
func (j *job) emitter(b *prepare.Bottle) (x optics.Emitter, why string) {
	spectral, inner := j.sv.Corrected(b)
	x = optics.Emitter{EEM: b.EEM, Absorbance: b.Absorb, InnerFilter: inner}
	switch {
	case b.Absorb == nil:
		why = "no absorbance is given"
	case !spectral:
		why = "its emission is not spectrally corrected; name [correct] emission_factors"
	case b.Setting.Correct.SpectralUnits != "photons":
		why = "a yield counts photons, and the emission is in energy units; make factors with --units photons"
	case !inner && b.Row.Dilution != 1:
		why = "it was diluted and its inner filter is not corrected"
	}
	return x, why
}

// checkYieldStandard says that the standard of the settings is not in the sheet.
func (j *job) checkYieldStandard() error {
	if id := j.set.Optics.YieldStandard; id != "" {
		if _, ok := j.sheet.Find(id); !ok {
			return fmt.Errorf("%s: optics.yield_standard: %s has no row with the id %q", filepath.Base(j.settingsPath()), filepath.Base(j.sheet.Path), id)
		}
	}
	return nil
}

// yieldFlags tells of a yield standard that absorbs more than such standards should.
func (j *job) yieldFlags() []eem.Flag {
	o := j.set.Optics
	std := j.bottle(o.YieldStandard)
	if std == nil || std.Absorb == nil {
		return nil
	}
	a, limit := std.Absorb.PerCM(o.ExcitationNM), j.sv.Limit("yield-standard")
	if !(a > limit) {
		return nil
	}
	return []eem.Flag{j.sv.Accept(eem.Flag{ID: std.Row.ID, Batch: std.Batch, Test: "yield-standard", Severity: eem.Remark, Value: a, Limit: limit,
		Msg: fmt.Sprintf("the yield standard has an absorbance of %.3g at ex %g nm; below %g the inner filter does not matter", a, o.ExcitationNM, limit)})}
}
