package survey

import "tarnlight/eem"

// Default returns the settings of a survey that states none. Why each value is
// what it is stands with its key (see Keys).
func Default() *Settings {
	return &Settings{
		Scans: Scans{Form: "auto", Delimiter: "auto", Decimal: "auto", Across: "auto"},
		Correct: Correct{
			InnerFilter:     "right-angle",
			AbsorbanceLimit: 1.5,
			CellCM:          1,
			Blank:           "batch-mean",
			BlankMaxAgeDays: 7,
			SpectralUnits:   "photons",
			Lamp:            "mercury",
		},
		Intensity: Intensity{Unit: "auto", ExcitationNM: 350, WindowNM: [2]float64{371, 428}, Baseline: "none"},
		Scatter: Scatter{
			Rayleigh: Orders{First: Band{Below: 15, Above: 15}, Second: Band{Below: 15, Above: 15}},
			Raman:    Orders{First: Band{Below: 10, Above: 15}, Second: Band{Below: 10, Above: 10}},
			Fill:     "missing",
		},
		Optics:   Optics{RefractiveIndex: 1.333, ExcitationNM: 350, WindowNM: [2]float64{370, 600}},
		Quantify: Quantify{References: "auto"},
		Resolve: Resolve{
			Components:   Components{Mode: "auto", From: 2, To: 7},
			Starts:       10,
			Seed:         1,
			Tolerance:    1e-8,
			ScaleSamples: true,
		},
		Quality: Quality{Limit: defaultLimits()},
		Report:  Report{Decimal: "point", Digits: 2, Pictures: "all"},
	}
}

// defaultLimits are the limits of all tests that have one.
func defaultLimits() map[string]float64 {
	m := make(map[string]float64)
	for _, t := range eem.Tests {
		if hasLimit(t) {
			m[t.Code] = t.Limit
		}
	}
	return m
}

// absorbanceLimit is the one test whose limit is a setting of its own,
// correct.absorbance_limit.
const absorbanceLimit = "absorbance-limit"

// hasLimit says whether a test's limit can be set under quality.limit.
func hasLimit(t eem.Test) bool {
	return t.Code != absorbanceLimit && (t.Limit != 0 || t.Unit != "")
}
