package main

import (
	"fmt"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/optics"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// opticsNames maps the columns of samples.csv to the indices.
var opticsNames = map[string]string{"suva254": "suva254", "slope_275_295": "s_275_295", "slope_350_400": "s_350_400", "slope_ratio": "s_r",
	"absorbance_250_365": "e2_e3", "fluorescence_index": "fi_470_520", "biological_index": "bix", "humification_index": "hix_sum", "humification_ratio": "hix_ratio", "freshness_index": "freshness",
	"peak_b": "peak_b", "peak_t": "peak_t", "peak_a": "peak_a", "peak_m": "peak_m", "peak_c": "peak_c"}

// indices returns the indices of a usable bottle's water, computed once.
func (j *job) indices(b *prepare.Bottle) []optics.Index {
	if list, ok := j.optics[b]; ok || !b.Usable() {
		return list
	}
	list := optics.Fluorescence(b.EEM)
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
			if ix.Refused == "" || !listed(ix.Name) {
				continue
			}
			r := at[ix.Name]
			if r == nil {
				r = &refusal{name: ix.Name, id: b.Row.ID, why: ix.Refused}
				at[ix.Name] = r
				list = append(list, r)
			}
			r.n++
		}
	}
	if len(list) == 0 {
		return nil
	}
	var words []string
	for _, r := range list {
		words = append(words, fmt.Sprintf("%s for %d of %d samples (%s: %s)", r.name, r.n, bottles, r.id, r.why))
	}
	return []eem.Flag{j.sv.Accept(eem.Flag{Test: "index-refused", Severity: eem.Remark, Value: float64(len(list)), Limit: nan,
		Msg: "indices not given: " + strings.Join(words, "; ")})}
}

// fluorescent are the indices without a unit that rest on fluorescence.
var fluorescent = map[string]bool{"fi_470_520": true, "bix": true, "hix_sum": true, "hix_ratio": true, "freshness": true}

// listed says whether an index rests on fluorescence and has a column in samples.csv.
func listed(name string) bool {
	for _, n := range opticsNames {
		if n == name {
			return strings.HasPrefix(n, "peak_") || fluorescent[n]
		}
	}
	return false
}
