package main

import (
	"slices"

	"tarnlight/eem"
)

// What a finding concerns, for whoever is woken by it.
const (
	concernInstrument = "instrument" // lamp, detector, wavelengths, blanks, scale
	concernModel      = "model"      // water unlike the model, or something in it that the model does not know
	concernLimit      = "limit"      // a number over a limit: alerts, standards, absorbance, quality samples
	concernData       = "data"       // files, run sheet and settings
)

// concerns lists the codes of each; what is on no list concerns the data.
var concerns = map[string][]string{
	concernInstrument: {"axes-swapped", "absorbance-negative", "batch-rejected", "batch-scale", "blank-borrowed", "blank-drift", "blank-level", "blank-range", "chart-rule",
		"counts", "lamp-lines", "low-light", "negative", "no-blank", "no-light", "plateau", "raman-law", "raman-range", "saturated",
		"scan-dropped", "scan-repeated", "spike", "wavelength"},
	concernModel: {"components-changed", "few-cells", "no-model-passes", "not-converged", "overlap", "peak-open", "peak-unseen", "starts-disagree",
		"structure", "unexplained", "unknown", "unlike-residual", "unlike-scores"},
	concernLimit: {"above-standards", "absorbance-limit", "alert", "control-action", "control-recovery", "dilution-differs", "duplicate", "field-blank",
		"field-duplicate", "holding-time", "linearity", "spike-recovery", "standard-recovery"},
	concernData: {"absorbance-range", "excitation-repeated", "factor-range", "grid-lost", "no-absorbance", "no-temperature", "reference-clipped",
		"reference-intercept", "same-content", "scan-short", "sheet-column", "unreadable"},
}

// concernOf says what a finding of this test concerns.
func concernOf(code string) string {
	for c, codes := range concerns {
		if slices.Contains(codes, code) {
			return c
		}
	}
	return concernData
}

// concerned lists, by what they concern, whom the doubts and rejects of flags speak
// of: ids, batches, or the survey; each once, in the order of the flags.
func concerned(flags []eem.Flag) map[string][]string {
	out := map[string][]string{concernInstrument: {}, concernModel: {}, concernLimit: {}, concernData: {}}
	for _, f := range flags {
		if f.Severity < eem.Doubt {
			continue
		}
		if c := concernOf(f.Test); !slices.Contains(out[c], flagged(f)) {
			out[c] = append(out[c], flagged(f))
		}
	}
	return out
}

// flagged names whom a flag speaks of.
func flagged(f eem.Flag) string {
	switch {
	case f.ID != "":
		return f.ID
	case f.Batch != "":
		return "batch " + f.Batch
	}
	return "survey"
}
