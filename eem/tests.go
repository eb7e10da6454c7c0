package eem

import (
	"slices"
	"strings"
)

// Test describes one check of the data: what code it writes to flags.csv, how
// bad a finding is and what it is held against.
type Test struct {
	Code     string
	Severity Severity
	Limit    float64 // default limit, in Unit; 0 where the test has none
	Unit     string
	What     string // what it finds, in one sentence
	Source   string // where the limit comes from
}

// Tests lists every test code that the module can write, sorted by code. A
// setting [quality] limit overrides a default by its code.
var Tests = sortTests([]Test{
	{"unreadable", Reject, 0, "", "a raw file of the bottle is missing or cannot be read", "-"},
	{"excitation-repeated", Reject, 0, "", "one excitation was scanned twice with different numbers", "-"},
	{"no-light", Reject, 0, "", "no light came through: the bottle's scans hold nothing but zeros or a constant", "common practice, no source"},
	{"saturated", Doubt, 0, "cells", "cells at or above the detector's limit were left out", "settings: scans.saturation"},
	{"no-absorbance", Doubt, 0, "", "no absorbance was given, so that the inner filter was not corrected", "-"},
	{"absorbance-limit", Doubt, 1.5, "", "total absorbance (excitation + emission, 1 cm) above the limit of the inner-filter correction", "Kothawala et al. 2013, Limnol. Oceanogr. Methods 11, 616"},
	{"absorbance-range", Doubt, 0, "cells", "cells outside the absorbance spectrum were left out", "-"},
	{"absorbance-negative", Doubt, 0.02, "", "the absorbance falls below zero by more than the limit: its baseline is off", "common practice, no source"},
	{"linear-range", Remark, 0.05, "", "ln(10)·A at an excitation is above the range where emission is proportional to concentration without correction", "1 − e^−x, computed: 2.5 % at 0.05"},
	{"factor-range", Remark, 0, "cells", "cells outside the spectral factors were left out", "-"},
	{"no-blank", Doubt, 0, "", "the batch has no blank, so that none was subtracted", "-"},
	{"blank-range", Doubt, 0, "cells", "the blank does not cover these cells; they were left out", "-"},
	{"counts", Doubt, 0, "", "no blank allows an intensity scale, so that results stay in counts", "-"},
	{"raman-range", Doubt, 0, "", "a blank of the batch does not cover the Raman line at the scale's excitation", "Lawaetz & Stedmon 2009, Appl. Spectrosc. 63, 936 (from memory)"},
	{"no-batch", Remark, 0, "", "neither batch nor measured date is given, so that all bottles form one batch", "-"},
	{"grid-part", Remark, 0, "cells", "the bottle lacks part of the survey's grid", "-"},
	{"grid-lost", Doubt, 25, "%", "the bottle lacks more than this share of the survey's or model's grid, and fewer than three bottles were scanned like it: files got lost", "common practice, no source"},
	{"grid-differs", Remark, 0, "", "the bottle's wavelengths differ from the survey's grid and were interpolated", "-"},
	{"interleaved", Remark, 0, "", "the scans' emission points interleave and were interpolated onto one axis", "-"},
	{"read-guess", Remark, 0, "", "how a raw file was taken: form, delimiter, decimal mark, encoding", "-"},
	{"unsorted", Remark, 0, "", "wavelengths were not in increasing order and were sorted", "-"},
	{"repeated-point", Remark, 0, "points", "a wavelength stands twice in a scan and the mean was taken", "-"},
	{"diluted", Remark, 0, "", "the result was multiplied by the dilution factor", "-"},
	{"alert", Doubt, 0, "", "a contribution of a sample is above what the settings state for its component", "settings: quality.alert"},
	{"above-standards", Doubt, 0, "", "the contribution is above the highest standard by more than two standard uncertainties", "common practice, no source"},
	{"reference-clipped", Doubt, 0, "cells", "saturated or over-absorbing cells of a standard were left out of the reference", "-"},
	{"reference-intercept", Doubt, 3, "standard errors", "the standards' own line does not pass through zero, by more than the limit and than chance explains (Student's t, 5 %)", "3: common practice, no source"},
	{"reference-levels", Remark, 2, "levels", "a reference rests on fewer levels than this", "-"},
	{"limits-low", Remark, 2, "times", "the laboratory's own critical value of a component is this many times below what the budgets of most samples give: a limit from pure water says nothing of what else is in a bottle", "common practice, no source"},
	{"few-cells", Reject, 0, "cells", "fewer cells than components are left", "-"},
	{"overlap", Doubt, 30, "", "condition number of the unit-norm components above the limit: they cannot be told apart well", "Belsley, Kuh & Welsch 1980 (from memory)"},
	{"unexplained", Doubt, 0.9, "", "share of the bottle's signal explained by the model below the limit; where what is left lies along a scatter line, within 10 nm of its band, that is said", "common practice, no source"},
	{"unknown", Doubt, 5, "standard uncertainties", "the bottle shows a component that the model does not know; a doubt where that moves a contribution by two standard uncertainties", "one survey in 100 by chance, computed"},
	{"structure", Remark, 4, "z", "Moran's I of the residual map: neighbouring residuals are alike, more than in differences of replicates where there are any; not asked of a bottle that alone determines its references, whose residual is rounding", "Cliff & Ord 1981 (from memory)"},
	{"not-converged", Doubt, 0, "", "the fit stopped before its tolerance was met", "-"},
	{"components-changed", Remark, 0, "", "a refit of the survey has other components than the results that it replaces", "Lorenzo-Seva & ten Berge 2006, Methodology 2, 57: congruence 0.95"},
	{"peak-open", Doubt, 0, "", "the data leave a resolved component open at its own peak", "-"},
	{"peak-unseen", Remark, 0, "share", "the spectra of a resolved component are greatest where emission is not longer than excitation, so that nothing fluoresces there", "Stokes' law"},
	{"no-model-passes", Doubt, 0, "", "no number of components passes every test of the choice", "-"},
	{"model-parts", Remark, 0, "", "the fixed model does not say how sure its spectra are, so that no uncertainty made with it holds that", "-"},
	{"unlike-residual", Doubt, 0, "", "a bottle leaves more of its signal over than the bottles of the fixed model do (99 % limit)", "Box 1954 (from memory)"},
	{"unlike-scores", Doubt, 0, "", "a bottle's mixture is unlike that of the bottles of the fixed model (99 % limit of T²)", "Tracy, Young & Mason 1992 (from memory)"},
	{"starts-disagree", Remark, 0.5, "share", "fewer starts than this share reached the best fit", "common practice, no source"},
	{"excluded", Remark, 0, "", "the sheet excludes the bottle; it takes part in nothing", "-"},
	{"excluded-from-fit", Remark, 0, "", "the sheet keeps the bottle out of model, references and charts", "-"},
	{"duplicate", Doubt, 20, "%", "relative difference of a bottle and its replicate, the same water measured again, above the limit", "plans in use differ from 10 to 30 %; 20 %: common practice, no source"},
	{"field-duplicate", Doubt, 30, "%", "relative difference of two bottles filled at one place and time above the limit", "plans in use differ from 10 to 100 %; 30 %: common practice, no source"},
	{"control-recovery", Doubt, 10, "%", "recovery of a control off 100 % by more than the limit", "common practice, no source"},
	{"control-action", Reject, 20, "%", "recovery of a control off 100 % by more than the action limit: the batch is rejected", "80–120 % for screening: common practice, no source"},
	{"batch-rejected", Reject, 0.5, "share", "more than this share of a batch's bottles is rejected, and so is the batch", "most of the tests fail: functional guidelines (from memory)"},
	{"batch-scale", Reject, 0, "", "a batch of several has no usable blank: none was subtracted and its intensities cannot be held against those of other batches", "-"},
	{"spike-recovery", Doubt, 20, "%", "recovery of a spike off 100 % by more than the limit", "common practice, no source"},
	{"field-blank", Doubt, 5, "times", "a bottle holds less than this many times of a component what a field blank of its batch holds", "five times: functional guidelines (from memory)"},
	{"standard-recovery", Doubt, 15, "%", "a standard calculated back from the references is off its amount by more than the limit, the lowest level by more than twice it", "common practice, no source"},
	{"linearity", Doubt, 10, "%", "the standards leave the line of the lower levels by more than the limit from some amount on", "idea: ASTM E578; limit: common practice, no source"},
	{"chart-rule", Doubt, 20, "points", "a quality variable breaks a rule of its control chart; the rules hold from this many points on, before that plain limits", "rules: Westgard et al. 1981, Clin. Chem. 27, 493 (from memory); 20 points: common practice, no source"},
	{"applied", Remark, 0, "", "a correction was done to the files before they came here and was not done again", "-"},
	{"sheet-column", Doubt, 0, "", "a column of the run sheet that is only carried along looks like a slip of one that counts", "-"},
	{"conc-unit", Remark, 0, "", "a column of known concentrations gives no unit", "-"},
	{"below-excitation", Remark, 0, "cells", "cells with an emission shorter than the excitation stay in the fits, because scatter was taken out before or is switched off", "Stokes' law: nothing fluoresces there"},
	{"sheet-conc", Remark, 0, "", "a known concentration is given for a row that is no standard, control or spike, and is not used", "-"},
	{"wavelength", Doubt, 1, "nm", "a scatter ridge lies off its line by more than the limit: a wavelength axis is off", "common practice, no source"},
	{"lamp-lines", Doubt, 1, "nm", "the lines of a lamp lie off their tabulated wavelengths by more than the limit", "common practice, no source"},
	{"raman-law", Doubt, 15, "%", "water's Raman areas depart from their law over excitation by more than the limit: the excitation factors are off", "law: Bartlett et al. 1998, Appl. Opt. 37, 3324; limit: common practice, no source"},
	{"low-light", Doubt, 0.5, "", "the bottle's own Raman line over that of its blanks is below the limit: bubble, blocked slit, tired lamp", "common practice, no source"},
	{"plateau", Doubt, 0, "cells", "the scans stay at their maximum, so that it was taken for the detector's limit; cells there were left out", "common practice, no source"},
	{"spike", Remark, 8, "standard deviations", "single cells stand out of all their neighbours by more than the limit and were left out", "common practice, no source"},
	{"axes-swapped", Reject, 0, "", "the light lies where emission is shorter than excitation: the axes are swapped", "Stokes' law"},
	{"scan-dropped", Doubt, 0, "scans", "scans hold nothing but one number beside scans that hold light; they were left out", "common practice, no source"},
	{"scan-short", Doubt, 10, "nm", "a scan ends or begins inside what its neighbours cover, by more than the limit: half a file", "common practice, no source"},
	{"scan-repeated", Doubt, 0, "scans", "two excitations hold the same numbers", "common practice, no source"},
	{"negative", Doubt, 1, "%", "share of the cells below −3 standard deviations after the blank was subtracted", "0.13 % expected of normal noise, computed; limit: common practice, no source"},
	{"noise-default", Remark, 0, "", "fewer than three blanks, so that the noise was estimated from the bottle itself", "-"},
	{"holding-time", Doubt, 7, "days", "the bottle was measured later after sampling than the limit", "at most 7 d cold and dark: common practice, no source"},
	{"same-content", Doubt, 0, "files", "raw files of two bottles hold the same bytes", "-"},
	{"unused-file", Remark, 0, "files", "raw files lie beside those of the sheet and no row uses them", "-"},
	{"dilution-differs", Doubt, 10, "%", "a bottle and its replicate at another dilution differ by more than the limit after all corrections: inner filter, quenching or a wrong dilution", "common practice, no source"},
	{"no-temperature", Doubt, 0, "", "the bottle's temperature is not given, so that it was not brought to the reference temperature", "-"},
	{"index-refused", Remark, 0, "indices", "an index of the water is not given, because its wavelengths were not measured or were filled", "more than 20 % of its window filled: common practice, no source"},
	{"yield-standard", Remark, 0.05, "", "the standard of quantum yields absorbs more at its excitation than such standards should", "practice of yields, to stay clear of the inner filter (IUPAC 2013: Resch-Genger & Rurack, from memory)"},
	{"blank-level", Doubt, 10, "%", "a blank glows outside the scatter bands, at its brightest spot by more than this share of its own Raman line: it is contaminated", "common practice, no source"},
	{"blank-borrowed", Remark, 0, "days", "the batch has no blank of its own or names others: blanks of another batch serve for subtraction and scale", "-"},
	{"blank-drift", Doubt, 5, "%", "the Raman area of a blank departs from that of the batch's other blanks by more than the limit, or the bottles' own Raman light from that of borrowed blanks: the lamp drifted, or a blank is wrong", "common practice, no source"},
	{"band-default", Remark, 0, "", "a scatter band's width could not be found from the blanks, so that the stated one holds", "-"},
	{"sheet-hidden", Remark, 0, "rows", "hidden rows of the workbook were read like the others", "-"},
})

// FindTest returns the test of a code.
func FindTest(code string) (Test, bool) {
	i, ok := slices.BinarySearchFunc(Tests, code, func(t Test, c string) int { return strings.Compare(t.Code, c) })
	if !ok {
		return Test{}, false
	}
	return Tests[i], true
}

func sortTests(t []Test) []Test {
	slices.SortFunc(t, func(a, b Test) int { return strings.Compare(a.Code, b.Code) })
	return t
}
