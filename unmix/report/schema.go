package report

import (
	"fmt"
	"slices"
)

// Column is one column of a results table.
type Column struct {
	Name string
	Unit string // empty: none, or given in a column `unit`; "intensity": that of the survey
	What string
}

// File is one results table.
type File struct {
	Name    string
	What    string
	Columns []Column
}

// ownSuffix is what a column of ours gets where the run sheet has one of its name.
const ownSuffix = "_found"

// FindFile returns the description of a results table.
func FindFile(name string) (File, bool) {
	i := slices.IndexFunc(Schema, func(f File) bool { return f.Name == name })
	if i < 0 {
		return File{}, false
	}
	return Schema[i], true
}

// New returns an empty table of the schema. It panics on a name that is not in it.
func New(name string) *Table {
	f, ok := FindFile(name)
	if !ok {
		panic(fmt.Sprintf("report: no results table %q", name))
	}
	t := &Table{Name: name}
	for _, c := range f.Columns {
		t.Columns = append(t.Columns, c.Name)
	}
	return t
}

// NewSamples returns the empty samples.csv of a run sheet: its columns first, in
// its order, then ours. Where the sheet has a column of one of our names, the
// sheet's is kept and ours gets the suffix "_found".
func NewSamples(sheet []string) *Table {
	t := New("samples.csv")
	own := t.Columns
	t.Columns = slices.Clone(sheet)
	for _, name := range own {
		for slices.Contains(t.Columns, name) {
			name += ownSuffix
		}
		t.Columns = append(t.Columns, name)
	}
	return t
}

// Own returns the place of one of our columns of samples.csv, whether or not the
// run sheet brought one of the same name; -1 where there is none.
func (t *Table) Own(name string) int {
	at := -1
	for i := t.Col(name); i >= 0; i = t.Col(name) {
		at = i
		name += ownSuffix
	}
	return at
}

// Schema lists the results tables with their columns in the order they were
// released; new columns are appended. samples.csv begins with the columns of the
// run sheet, which are not listed here.
var Schema = []File{
	{"contributions.csv", "how much of each component each bottle holds; rejected bottles too", []Column{
		{"id", "", "the bottle"},
		{"component", "", "name of the component; for method unexplained what no component accounts for"},
		{"method", "", "references, parafac, model (a fixed model applied) or unexplained"},
		{"value", "", "contribution in the bottle, never rounded or censored; for parafac and model the fluorescence maximum Fmax"},
		{"unit", "", "of value and of every uncertainty and limit in the row"},
		{"standard_uncertainty", "", "combined standard uncertainty (k = 1)"},
		{"lower95", "", "lower end of the 95 % interval, 0 or more"},
		{"upper95", "", "upper end of the 95 % interval"},
		{"detection_limit", "", "smallest contribution that is found with 95 % probability"},
		{"qualifier", "", "U not detected; J unreliable or above the highest standard; R not usable; empty otherwise"},
		{"critical_value", "", "a value above it is told from nothing with 5 % risk of error"},
		{"quantification_limit", "", "smallest contribution with a relative standard uncertainty of 10 %"},
		{"detected", "", "true where value is above critical_value"},
		{"reported", "", "the result as it goes into a report: rounded, or \"< detection limit\""},
		{"reasons", "", "why there is a qualifier, in words"},
		{"model", "", "which references or model the value rests on"},
	}},
	{"samples.csv", "one row a bottle: the run sheet, then how well its EEM was explained and what the water itself shows", []Column{
		{"cells_used", "cells", "cells of the EEM that took part"},
		{"fit_method", "", "the method that the columns up to condition_number speak of"},
		{"explained_percent", "%", "share of the bottle's sum of squares that the components explain"},
		{"residual_rms", "intensity", "root mean square of what the components leave"},
		{"noise_rms", "intensity", "root mean square that noise alone would leave"},
		{"structure", "z", "Moran's I of the residual map in standard deviations: how alike neighbouring residuals are"},
		{"hottest_ex_nm", "nm", "excitation of the largest residual"},
		{"hottest_em_nm", "nm", "emission of the largest residual"},
		{"hottest_value", "intensity", "the largest residual"},
		{"condition_number", "", "of the unit-norm components on this bottle's cells: how badly errors can grow"},
		{"largest_inner_filter_factor", "", "largest factor of the inner-filter correction in the cells used"},
		{"suva254", "L/(mg m)", "specific UV absorbance: decadic absorbance at 254 nm per metre over dissolved organic carbon"},
		{"slope_275_295", "1/nm", "spectral slope of the absorption coefficient, 275–295 nm"},
		{"slope_350_400", "1/nm", "spectral slope of the absorption coefficient, 350–400 nm"},
		{"slope_ratio", "", "slope_275_295 / slope_350_400"},
		{"absorbance_250_365", "", "absorbance at 250 nm over that at 365 nm"},
		{"fluorescence_index", "", "fluorescence index: emission 470 over 520 nm at excitation 370 nm"},
		{"biological_index", "", "biological index: emission 380 over 430 nm at excitation 310 nm"},
		{"humification_index", "", "humification index, 0 to 1: area 435–480 over area 300–345 plus 435–480 nm at excitation 254 nm"},
		{"humification_ratio", "", "humification index, ratio form: area 435–480 over area 300–345 nm at excitation 254 nm"},
		{"freshness_index", "", "emission 380 nm over the maximum of 420–435 nm at excitation 310 nm"},
		{"peak_b", "intensity", "fluorescence at ex 275 / em 310 nm, tyrosine-like"},
		{"peak_t", "intensity", "fluorescence at ex 275 / em 340 nm, tryptophan-like"},
		{"peak_a", "intensity", "maximum at ex 260 / em 380–460 nm, humic-like"},
		{"peak_m", "intensity", "maximum at ex 312 / em 380–420 nm, humic-like, marine or microbial"},
		{"peak_c", "intensity", "maximum at ex 350 / em 420–480 nm, humic-like"},
		{"notes", "", "number of notes in flags.csv"},
		{"doubts", "", "number of doubts in flags.csv"},
		{"rejects", "", "number of rejects in flags.csv"},
		{"leverage", "", "how much the bottle pulls the resolved model, 0 to 1; empty where it took no part"},
		{"influence", "standard errors", "largest move of a loading when the bottle is left out"},
		{"linear_from_nm", "nm", "shortest excitation from which on ln(10)·absorbance is 0.05 or less: there emission is proportional to concentration even without correction"},
		{"quantum_yield", "", "apparent quantum yield against the standard of [optics]: of all that absorbs at its excitation, over its window"},
		{"absorption_254", "1/m", "Napierian absorption coefficient at 254 nm, ln(10)·absorbance per metre"},
		{"absorption_350", "1/m", "the same at 350 nm"},
		{"absorption_440", "1/m", "the same at 440 nm"},
		{"aromaticity", "%", "aromatic share of carbon that suva254 points to, 6.52·SUVA + 3.63"},
		{"absorbance_465_665", "", "absorbance at 465 nm over that at 665 nm"},
		{"fluorescence_index_first", "", "fluorescence index in its first form, for spectra that are not corrected: emission 450 over 500 nm at excitation 370 nm"},
		{"freshness_boxes", "", "maximum of ex 310–320 / em 380–420 over that of ex 330–350 / em 420–480 nm"},
		{"region_1", "%", "share of ex 200–250 / em 280–330 nm, tyrosine-like, on this grid's own areas"},
		{"region_2", "%", "share of ex 200–250 / em 330–380 nm, tryptophan-like"},
		{"region_3", "%", "share of ex 200–250 / em 380–550 nm, fulvic-like"},
		{"region_4", "%", "share of ex 250–400 / em 280–380 nm, microbial by-product-like"},
		{"region_5", "%", "share of ex 250–400 / em 380–550 nm, humic-like"},
		{"over_absorbing_percent", "%", "share of the cells at or above the first Rayleigh line whose total absorbance is above the limit of the inner-filter correction"},
		{"residual_chi_square", "", "sum of squared residuals over their variance by the noise model, a degree of freedom: 1 is noise alone"},
		{"residual_runs", "z", "runs of equal sign along emission: below 0, neighbouring residuals are alike (Wald & Wolfowitz)"},
		{"residual_yardstick", "", "what the residual is held against: the noise model, or differences of replicates, which know how alike the noise of neighbours is"},
		{"structure_beyond_yardstick", "z", "structure less that of the yardstick, what the test is made on"},
		{"clearest_ex_nm", "nm", "excitation of the residual that stands out most of its own noise"},
		{"clearest_em_nm", "nm", "emission of it"},
		{"clearest_value", "intensity", "its height"},
		{"clearest_z", "standard deviations", "its height over the noise of that cell"},
		{"clearest_ex_extent_nm", "nm", "how far it stays above half its height, along excitation"},
		{"clearest_em_extent_nm", "nm", "the same along emission"},
	}},
	{"flags.csv", "what the checks found", []Column{
		{"id", "", "the bottle; empty where the finding concerns a batch or the survey"},
		{"batch", "", "the batch; empty where the finding concerns the survey"},
		{"component", "", "the component it concerns; empty for all"},
		{"method", "", "the method it concerns; empty for all"},
		{"test", "", "code of the check; `tests --list` explains it"},
		{"severity", "", "note, doubt or reject"},
		{"value", "", "what was found"},
		{"limit", "", "what it was held against"},
		{"message", "", "in words, with the remedy"},
		{"file", "", "the file it was found in"},
		{"line", "", "and the line"},
	}},
	{"components.csv", "spectra of every candidate model and of the references; also the layout of a reference file", []Column{
		{"component", "", "name"},
		{"mode", "", "excitation, emission, or scale: intensity at the maximum for one unit of amount"},
		{"wavelength_nm", "nm", "wavelength; empty for scale"},
		{"loading", "", "relative intensity, maximum 1; of scale the intensity itself"},
		{"standard_uncertainty", "", "standard uncertainty of loading"},
		{"determined", "", "false where the data leave the loading open; it is drawn as a gap"},
		{"method", "", "references, parafac or model"},
		{"components", "", "how many components the model has that the spectrum belongs to"},
		{"chosen", "", "true for the model that the results rest on"},
		{"unit", "", "unit of the component's amount; empty where contributions are Fmax"},
	}},
	{"models.csv", "one row a candidate number of components", []Column{
		{"components", "", "number of components"},
		{"samples", "", "bottles fitted"},
		{"cells", "", "cells fitted"},
		{"loss", "", "weighted sum of squares left"},
		{"explained_percent", "%", "share of the sum of squares explained"},
		{"core_consistency", "%", "how trilinear the model is; says nothing for one or two components"},
		{"split_half_excitation", "", "lowest congruence of the halves' excitation spectra"},
		{"split_half_emission", "", "lowest congruence of the halves' emission spectra"},
		{"starts", "", "starts made"},
		{"starts_agreeing", "", "starts that reached the best fit"},
		{"iterations", "", "iterations of the best start"},
		{"converged", "", "whether the best start met its tolerance"},
		{"newton_decrement", "standard errors", "how far the solution may still be from the optimum"},
		{"structure", "", "mean correlation of neighbouring residuals; 0 is noise"},
		{"triple_cosine", "", "largest product of the three modes' cosines between two components; above 0.7 one is shared by two"},
		{"revived", "", "components that died and were started again"},
		{"plausible", "", "whether every component is greatest where it can fluoresce, emission longer than excitation; false speaks of scatter or of one component too many"},
		{"verdict", "", "pass, doubt or fail"},
		{"chosen", "", "true for the model that the results rest on"},
		{"reason", "", "why it passed or failed, in words"},
		{"seed", "", "seed of the starts"},
	}},
	{"splits.csv", "one row a split and component", []Column{
		{"components", "", "number of components of the model"},
		{"split", "", "name of the split: which parts were held against each other"},
		{"component", "", "component of the whole model"},
		{"congruence_excitation", "", "Tucker congruence of the halves' excitation spectra"},
		{"congruence_emission", "", "Tucker congruence of the halves' emission spectra"},
		{"limit", "", "what both are held against"},
		{"passed", "", "true where both are at or above the limit"},
		{"excitation_peak_shift_nm", "nm", "excitation peak of the second half less that of the first"},
		{"emission_peak_shift_nm", "nm", "the same of the emission peak"},
		{"excitation_centroid_shift_nm", "nm", "the same of the excitation centroid"},
		{"emission_centroid_shift_nm", "nm", "the same of the emission centroid"},
		{"first_half", "", "bottles in the first half"},
		{"second_half", "", "bottles in the second half"},
	}},
	{"split_spectra.csv", "spectra of the halves, for the picture that lays them over one another", []Column{
		{"components", "", "number of components of the model"},
		{"split", "", "name of the split"},
		{"half", "", "which half"},
		{"component", "", "component of the whole model that it matches"},
		{"mode", "", "excitation or emission"},
		{"wavelength_nm", "nm", "wavelength"},
		{"loading", "", "relative intensity, maximum 1; empty where undetermined"},
	}},
	{"batches.csv", "verdict per batch", []Column{
		{"batch", "", "name"},
		{"setup", "", "the setup it was measured with"},
		{"measured", "", "day"},
		{"samples", "", "samples and field blanks; blanks, standards, controls and spikes are bottles too and count where the reason speaks of bottles of all kinds"},
		{"blanks", "", "ids of the blanks used"},
		{"standards", "", "number of standards"},
		{"controls", "", "number of controls and spikes"},
		{"unit", "", "intensity unit of the batch"},
		{"scale", "counts", "counts that make one intensity unit"},
		{"scale_relative_uncertainty", "", "relative standard uncertainty of scale"},
		{"raman_peak_nm", "nm", "where water's Raman line was found"},
		{"raman_signal_to_noise", "", "height of that line over the noise"},
		{"blank_rms", "intensity", "spread of the blanks"},
		{"notes", "", "number of notes"},
		{"doubts", "", "number of doubts"},
		{"rejects", "", "number of rejects"},
		{"verdict", "", "good, doubt or reject"},
		{"reason", "", "why, in words"},
	}},
	{"calibration.csv", "given, found and recovery per standard, control and spike", []Column{
		{"id", "", "the standard, control or spike"},
		{"batch", "", "its batch"},
		{"kind", "", "standard, control or spike"},
		{"component", "", "the component"},
		{"given", "", "concentration given in the run sheet"},
		{"found", "", "concentration found"},
		{"unit", "", "of given and found"},
		{"standard_uncertainty", "", "of found"},
		{"recovery_percent", "%", "found over given"},
		{"low_limit_percent", "%", "lowest recovery accepted"},
		{"high_limit_percent", "%", "highest recovery accepted"},
		{"used", "", "true where it took part in the reference"},
		{"verdict", "", "pass, doubt or reject"},
		{"reason", "", "why, in words"},
		{"line_slope", "", "slope of the component's line, found against given, fitted with an intercept"},
		{"line_intercept", "", "its intercept, in the unit of given; 0 where the series passes through the origin"},
		{"line_intercept_standard_error", "", "standard error of line_intercept; empty with fewer than three levels"},
	}},
	{"charts.csv", "quality variables with their limits", []Column{
		{"variable", "", "what is watched"},
		{"batch", "", "the batch"},
		{"id", "", "the bottle, where it is one bottle's"},
		{"measured", "", "day or time"},
		{"value", "", "found"},
		{"unit", "", "of value and limits"},
		{"centre", "", "the value expected"},
		{"warn_low", "", "warning limit"},
		{"warn_high", "", "warning limit"},
		{"act_low", "", "action limit"},
		{"act_high", "", "action limit"},
		{"verdict", "", "pass, doubt or reject"},
		{"rule", "", "the rule that was broken"},
	}},
	{"budget.csv", "uncertainty by cause per value", []Column{
		{"id", "", "the bottle"},
		{"component", "", "the component"},
		{"method", "", "the method"},
		{"cause", "", "source of error"},
		{"scope", "", "who shares the error: cell, bottle, standard, batch or survey"},
		{"standard_uncertainty", "", "its part of the standard uncertainty"},
		{"unit", "", "of standard_uncertainty"},
		{"share_percent", "%", "share of the combined variance"},
		{"degrees_of_freedom", "", "empty where it is not from few repetitions"},
		{"source", "", "where the figure comes from"},
	}},
	{"steps.csv", "every step of the work with its parameters", []Column{
		{"order", "", "place in the order of work, from 1"},
		{"setup", "", "the setup it holds for; empty for all"},
		{"step", "", "the step"},
		{"parameter", "", "name of the parameter; empty for the step itself"},
		{"value", "", "value in force"},
		{"unit", "", "of value"},
		{"source", "", "setting, file or publication it comes from"},
		{"note", "", "what was done, in words"},
	}},
	{"limits.csv", "the limits in force, and the published forms beside them with what they rest on", []Column{
		{"component", "", "the component"},
		{"method", "", "the method"},
		{"form", "", "this survey (its own limits), laboratory (settings: quantify.limits), Currie, ISO 11843-2, or MDL (method detection limit)"},
		{"basis", "", "what it rests on: samples, blanks, field blanks, replicates of a bottle, standards"},
		{"n", "", "how many values"},
		{"batches", "", "from how many batches"},
		{"given", "", "amount given to the replicates; 0 for blanks"},
		{"mean", "", "mean of the values; of standards the mean amount given"},
		{"sd", "", "standard deviation of all values; of standards that about their line"},
		{"sd_within", "", "standard deviation within a batch"},
		{"sd_between", "", "standard deviation of what a batch has for itself"},
		{"sd_total", "", "standard deviation of one measurement that the limits rest on"},
		{"degrees_of_freedom", "", "of sd_total"},
		{"critical_value", "", "a value above it is told from nothing"},
		{"detection_limit", "", "smallest contribution that is found with 95 % probability; of the MDL the critical value at 1 % risk"},
		{"quantification_limit", "", "smallest contribution with a relative standard deviation of 10 %"},
		{"unit", "", "of all amounts in the row"},
		{"usable", "", "false where limits may not be set by it"},
		{"note", "", "why not, or what makes it less than it should be"},
		{"values", "", "the values, batches parted by |; of blanks and standards as least squares sees them, below zero too"},
		{"source", "", "published source of the formula"},
	}}, {"blanks.csv", "how blanks shine outside the scatter bands: spectra through the brightest spot of each", []Column{
		{"batch", "", "the batch"},
		{"id", "", "the blank"},
		{"mode", "", "excitation or emission"},
		{"at_nm", "nm", "the other wavelength, that of the brightest spot"},
		{"wavelength_nm", "nm", "wavelength"},
		{"percent", "%", "intensity in percent of the height of the blank's own Raman line; empty in a scatter band"},
		{"others_percent", "%", "the same of the batch's other blanks, their mean; empty where there is none"},
		{"doubtful", "", "true where the blank's brightest spot is above the limit of the test blank-level"},
	}},
	{"tests.csv", "statistical tests that were made many times, and how many findings chance alone would give", []Column{
		{"test", "", "code of the test; detected is the decision whether a component is there"},
		{"method", "", "the method it concerns; empty for none"},
		{"component", "", "the component, of detected"},
		{"of", "", "what was tested"},
		{"n", "", "how many of them"},
		{"rate", "", "probability that one is found by chance where nothing is"},
		{"expected_by_chance", "", "n times rate"},
		{"found", "", "how many were found"},
		{"note", "", "how the rate is meant"},
	}},
}
