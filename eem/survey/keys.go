package survey

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"sync"

	"tarnlight/eem"
)

// key is one setting: where it stands in the file, where in Settings, and how it
// moves between both.
type key struct {
	table, name string
	field       func(*Settings) any // pointer to the field that the codec takes
	codec       codec
	reason      string
}

// full is the key's dotted name.
func (k *key) full() string {
	if k.table == "" {
		return k.name
	}
	return k.table + "." + k.name
}

// set reads a decoded value into s.
func (k *key) set(s *Settings, v any) error {
	err := k.codec.read(k.field(s), v)
	if err == nil {
		return nil
	}
	msg := showValue(v) + " is not allowed"
	if err.Error() != "" {
		msg += ": " + err.Error()
	}
	return fmt.Errorf("%s; write %s", msg, k.codec.what)
}

// schema lists every setting, in the order in which they are written.
var schema = sync.OnceValue(func() []*key {
	return slices.Concat(topKeys(), readingKeys(), correctionKeys(), modelKeys(), judgingKeys(), reportKeys())
})

// byName finds a key by its dotted name.
var byName = sync.OnceValue(func() map[string]*key {
	m := make(map[string]*key)
	for _, k := range schema() {
		m[k.full()] = k
	}
	return m
})

// Keys lists every setting with its default, in the order in which they are
// written. The keys of a [setup.NAME] table come last; beside its own three it
// takes every key of the tables scans, correct, intensity and scatter.
func Keys() []Key {
	def := Default()
	var out []Key
	for _, k := range schema() {
		out = append(out, Key{Table: k.table, Name: k.name, Type: k.codec.what,
			Default: k.codec.write(k.field(def)), Reason: k.reason})
	}
	for _, k := range setupKeys() {
		out = append(out, Key{Table: "setup.NAME", Name: k.name, Type: k.codec.what, Default: `""`, Reason: k.reason})
	}
	return append(out, Key{Table: "setup.NAME", Name: strings.Join(setupTables, ".…, ") + ".…",
		Type: "as in the table", Default: "the table's value",
		Reason: "replaces any key of these tables for the rows whose setup is NAME, such as scans.form = \"grid\""})
}

func topKeys() []*key {
	return []*key{
		{"", "title", func(s *Settings) any { return &s.Title }, text("text"),
			"stands at the head of the report"},
		{"sheet", "root", func(s *Settings) any { return &s.Sheet.Root }, text("a folder, relative to the survey folder or absolute"),
			"where the raw files that the run sheet names lie; empty is the survey folder itself, so that a survey can be moved whole"},
		{"sheet", "exclusions", func(s *Settings) any { return &s.Sheet.Exclusions }, text("a CSV file with the columns id and reason"),
			"rows excluded by eye after a look at the report are merged by id; empty is none"},
		{"sheet", "name", func(s *Settings) any { return &s.Sheet.Name }, pattern("id"),
			"how begin reads ids, kinds and days from file names; empty lets begin look by itself"},
		{"sheet", "kinds", func(s *Settings) any { return &s.Sheet.Kinds }, kindsCodec(),
			"the laboratory's own words for kinds, beside sample, blank, standard …: what {kind} of name says, or without it the letters that an id begins with; empty, because no two laboratories use the same"},
		{"sheet", "ignore", func(s *Settings) any { return &s.Sheet.Ignore }, patternsCodec(),
			"names of files and folders below the root that begin passes over and nobody misses in the sheet; empty, because a file that is left out should be known"},
	}
}

func readingKeys() []*key {
	return []*key{
		{"scans", "form", func(s *Settings) any { return &s.Scans.Form }, choice("auto", "stack", "grid", "long", "jcamp"),
			"layout of the scan files; auto decides from the content and says what it decided"},
		{"scans", "delimiter", func(s *Settings) any { return &s.Scans.Delimiter }, choice("auto", "comma", "semicolon", "tab", "blank"),
			"what stands between the columns; auto decides for every file from its content"},
		{"scans", "decimal", func(s *Settings) any { return &s.Scans.Decimal }, choice("auto", "point", "comma"),
			"decimal mark; auto decides for every file, never for a single number, and refuses what can be read both ways"},
		{"scans", "skip", func(s *Settings) any { return &s.Scans.Skip }, whole(0, 100_000),
			"lines left out at the top of every file; 0 finds the first line of numbers by itself"},
		{"scans", "excitation", func(s *Settings) any { return &s.Scans.Excitation }, pattern("nm"),
			"finds the excitation in a file name or header line; empty tries the header, then forms like ex350 in the name"},
		{"scans", "across", func(s *Settings) any { return &s.Scans.Across }, choice("auto", "excitation", "emission"),
			"what runs across a grid file; auto decides by its header, then by the light itself, and refuses what neither tells"},
		{"scans", "saturation", func(s *Settings) any { return &s.Scans.Saturation }, number(bounds{hi: math.Inf(1), unit: "counts"}),
			"cells at or above it are clipped and left out, in standards too; 0 is none stated, because only the instrument's manual tells it"},
		{"scans", "offset", func(s *Settings) any { return &s.Scans.Offset }, offsetCodec(),
			"the detector's reading without light, subtracted first; 0 because most instruments subtract it themselves"},
		{"scans", "applied", func(s *Settings) any { return &s.Scans.Applied }, stepsCodec(AppliedSteps),
			"corrections done before the files came here: not done again, and recorded; empty, because raw counts can be corrected best"},
		{"grid", "excitation", func(s *Settings) any { return &s.Grid.Excitation }, rangeCodec(),
			"excitations of the survey's grid; auto is the axis of the most samples, so that the fewest are interpolated"},
		{"grid", "emission", func(s *Settings) any { return &s.Grid.Emission }, rangeCodec(),
			"emissions of the survey's grid; auto is the axis of the most samples, so that the fewest are interpolated"},
	}
}

// angle in air, degrees from the normal of a face.
var angle = bounds{lo: 0, hi: 85, unit: "°"}

func correctionKeys() []*key {
	def := Default().Scatter
	return []*key{
		{"correct", "excitation_factors", func(s *Settings) any { return &s.Correct.ExcitationFactors }, text("a file wavelength_nm,factor"),
			"multiplies each scan by the factor at its excitation; empty: not corrected; never extrapolated"},
		{"correct", "emission_factors", func(s *Settings) any { return &s.Correct.EmissionFactors }, text("a file wavelength_nm,factor"),
			"multiplies each cell by the factor at its emission; empty: not corrected; never extrapolated"},
		{"correct", "inner_filter", func(s *Settings) any { return &s.Correct.InnerFilter }, choice("right-angle", "front-face", "transmission", "none"),
			"geometry of the inner-filter correction; right-angle is how nearly every cell holder is built (Parker & Rees 1962, Analyst 87, 83)"},
		{"correct", "excitation_window_cm", func(s *Settings) any { return &s.Correct.ExcitationWindowCM }, windowCodec(),
			"stretch of the excitation beam that the detector sees, from the wall where light enters; centre (0.5 cm) is within 1 % of a 0.3–0.7 cm window up to A = 0.5"},
		{"correct", "emission_window_cm", func(s *Settings) any { return &s.Correct.EmissionWindowCM }, windowCodec(),
			"stretch from which light leaves, from the wall where it leaves; centre for the same reason"},
		{"correct", "absorbance_limit", func(s *Settings) any { return &s.Correct.AbsorbanceLimit }, number(bounds{hi: 10, open: true, unit: "total absorbance over the measuring cell"}),
			"above it (excitation + emission) a bottle is flagged with the dilution that would help; 1.5 after Kothawala et al. 2013, Limnol. Oceanogr. Methods 11, 616"},
		{"correct", "cell_cm", func(s *Settings) any { return &s.Correct.CellCM }, number(bounds{hi: 10, open: true, unit: "cm"}),
			"inner width of the cell in the fluorometer; 1, the usual one (that of the absorbance cell is the column absorbance_path_cm)"},
		{"correct", "incidence_deg", func(s *Settings) any { return &s.Correct.IncidenceDeg }, number(angle),
			"angle in air at which the excitation meets the face of a front-face or transmission cell; 0 is straight on; refracted by Snell's law (n = 1.333) it lengthens the path by 1/cos"},
		{"correct", "observation_deg", func(s *Settings) any { return &s.Correct.ObservationDeg }, number(angle),
			"angle in air at which that cell is looked at, likewise"},
		{"correct", "blank", func(s *Settings) any { return &s.Correct.Blank }, choice("batch-mean", "listed", "latest", "none"),
			"which blanks are subtracted: the mean of the batch, those of the column blanks, or the last one measured before the bottle; the mean halves the noise of one of four"},
		{"correct", "blank_max_age_days", func(s *Settings) any { return &s.Correct.BlankMaxAgeDays }, number(bounds{hi: 3660, unit: "days"}),
			"how old a blank may be for latest, 0 any age; a week: common practice, no source"},
		{"correct", "temperature", func(s *Settings) any { return &s.Correct.Temperature }, temperatureCodec(),
			"brings fluorescence to one temperature by the column temperature_c; off, because the coefficient depends on the water"},
		{"correct", "spectral_units", func(s *Settings) any { return &s.Correct.SpectralUnits }, choice("photons", "energy"),
			"what the factors bring intensities to; water's Raman line is held against the law for it (Bartlett et al. 1998, Appl. Opt. 37, 3324); photons, because a fluorometer counts them"},
		{"correct", "lamp_scan", func(s *Settings) any { return &s.Correct.LampScan }, text("a scan as exported, or a table wavelength_nm, counts"),
			"scan of a line lamp, held against the tabulated lines; empty is none; data are never shifted"},
		{"correct", "lamp", func(s *Settings) any { return &s.Correct.Lamp }, choice("mercury", "mercury-argon"),
			"which lamp that is; mercury, the one in most laboratories (lines: NIST Atomic Spectra Database)"},
		{"correct", "off", func(s *Settings) any { return &s.Correct.Off }, stepsCodec(OffSteps),
			"steps that are not done, by name; empty, because each takes out an error; what is left out stands in steps.csv"},
		{"intensity", "unit", func(s *Settings) any { return &s.Intensity.Unit }, unitCodec("auto", "raman", "quinine", "counts"),
			"unit of intensity; auto is Raman units where every batch has a blank, else counts and a flag; with applied = [\"intensity\"] the unit of the files, arbitrary units (a.u.) where it is auto; counts for arbitrary units that are to stay"},
		{"intensity", "excitation_nm", func(s *Settings) any { return &s.Intensity.ExcitationNM }, number(wavelength),
			"excitation of the water Raman line that sets the scale; 350 after Lawaetz & Stedmon 2009, Appl. Spectrosc. 63, 936 (from memory)"},
		{"intensity", "window_nm", func(s *Settings) any { return &s.Intensity.WindowNM }, pair(wavelength),
			"emission over which that line is integrated; 371–428 from the same source (from memory)"},
		{"intensity", "baseline", func(s *Settings) any { return &s.Intensity.Baseline }, choice("none", "straight"),
			"what is taken off below the line; none from the same source; straight joins the window's ends, for water that fluoresces itself"},
		{"scatter", "rayleigh.first", func(s *Settings) any { return &s.Scatter.Rayleigh.First }, bandCodec(def.Rayleigh.First, false),
			"removed around the excitation wavelength; 15 nm is three bandpasses of 5 nm and the middle of the 10–20 nm in the literature; no blank takes this line away"},
		{"scatter", "rayleigh.second", func(s *Settings) any { return &s.Scatter.Rayleigh.Second }, bandCodec(def.Rayleigh.Second, false),
			"removed around twice the excitation wavelength; 15 nm like the first order, which it repeats"},
		{"scatter", "raman.first", func(s *Settings) any { return &s.Scatter.Raman.First }, bandCodec(def.Raman.First, true),
			"removed around water's Raman line; 10 below and 15 above, because the line is longer towards the red (382–418 nm about 397 nm at ex 350) and the blank takes most of it"},
		{"scatter", "raman.second", func(s *Settings) any { return &s.Scatter.Raman.Second }, bandCodec(def.Raman.Second, true),
			"removed around twice water's Raman line; 10 nm, in the middle of the 5–15 nm in the literature: the line is weak"},
		{"scatter", "fill", func(s *Settings) any { return &s.Scatter.Fill }, choice("missing", "interpolate", "zero"),
			"what stands in the removed bands; missing, because the fits need no invented numbers"},
	}
}

func modelKeys() []*key {
	return []*key{
		{"optics", "yield_standard", func(s *Settings) any { return &s.Optics.YieldStandard }, text("an id of the run sheet"),
			"quinine standard (or another) against which the apparent quantum yield of every sample is computed; it needs an absorbance; empty: no yields"},
		{"optics", "yield", func(s *Settings) any { return &s.Optics.Yield }, declaredCodec(bounds{hi: 1, open: true, unit: "quantum yield"}),
			"quantum yield of that standard; no default: for quinine sulfate 0.51, 0.546 and 0.60 are all in print, for different acids and concentrations (IUPAC: Resch-Genger & Rurack 2013, Pure Appl. Chem. 85, 2005)"},
		{"optics", "yield_source", func(s *Settings) any { return &s.Optics.YieldSource }, text("text"),
			"medium of that standard and where its yield comes from; needed with yield, and printed with the results"},
		{"optics", "refractive_index", func(s *Settings) any { return &s.Optics.RefractiveIndex }, number(bounds{lo: 1, hi: 2, unit: "refractive index"}),
			"of the standard's medium; 1.333, water at 589 nm and 25 °C; 0.05–0.5 mol/L sulfuric acid has 1.333–1.338 (from memory)"},
		{"optics", "yield_excitation_nm", func(s *Settings) any { return &s.Optics.ExcitationNM }, number(wavelength),
			"where both are excited; 350, at the second absorption maximum of quinine sulfate (347.5 nm: SRM 936 certificate)"},
		{"optics", "yield_window_nm", func(s *Settings) any { return &s.Optics.WindowNM }, pair(wavelength),
			"emission over which both are integrated; 370–600 nm: between the Rayleigh line of 350 nm and the end of most scans (common practice, no source)"},
		{"quantify", "references", func(s *Settings) any { return &s.Quantify }, referencesCodec(),
			"what samples are quantified against; auto is the sheet's standards where there are any, else none"},
		{"quantify", "limits", func(s *Settings) any { return &s.Quantify.Limits }, text("a CSV file"),
			"the laboratory's own detection limits, which then replace the computed ones; empty is none"},
		{"resolve", "components", func(s *Settings) any { return &s.Resolve.Components }, componentsCodec(),
			"how many components are looked for; auto is off where the sheet has standards, else 2 to 7, the range of most published surveys of natural water (common practice, no source)"},
		{"resolve", "choose", func(s *Settings) any { return &s.Resolve.Choose }, whole(0, maxComponents),
			"number of components reported; 0 is the largest number that passes every test"},
		{"resolve", "because", func(s *Settings) any { return &s.Resolve.Because }, text("text"),
			"why that number was chosen; needed with choose, and printed in the report"},
		{"resolve", "starts", func(s *Settings) any { return &s.Resolve.Starts }, whole(1, 1000),
			"random starts of every number of components; 10: one start in ten found the best fit of a hard data set"},
		{"resolve", "seed", func(s *Settings) any { return &s.Resolve.Seed }, seed(),
			"starts the random generator; the same seed gives the same bytes"},
		{"resolve", "tolerance", func(s *Settings) any { return &s.Resolve.Tolerance }, number(bounds{lo: 1e-15, hi: 0.01, unit: "relative"}),
			"a start stops when its loss falls by less than this share; 1e-8, because at 1e-4 loadings were still thousands of standard errors away"},
		{"resolve", "scale_samples", func(s *Settings) any { return &s.Resolve.ScaleSamples }, boolean(),
			"fits every bottle at unit norm, so that strong bottles do not drown the pattern of weak ones"},
		{"resolve", "split_by", func(s *Settings) any { return &s.Resolve.SplitBy }, text("a column of the run sheet"),
			"rows with the same value stay together when the survey is split in halves; empty splits by the order of the sheet"},
		{"resolve", "hold", func(s *Settings) any { return &s.Resolve.Hold }, text("a reference file"),
			"components whose spectra are known and held while others are free; empty is none"},
	}
}

func judgingKeys() []*key {
	percent := bounds{hi: 100, unit: "%"}
	ks := []*key{
		{"uncertainty", "standards_percent", func(s *Settings) any { return &s.Uncertainty.StandardsPercent }, declaredCodec(percent),
			"standard uncertainty of a component's stock, shared by its levels; only the laboratory knows it"},
		{"uncertainty", "dilution_percent", func(s *Settings) any { return &s.Uncertainty.DilutionPercent }, declaredCodec(percent),
			"standard uncertainty of a dilution factor; only the laboratory knows it"},
		{"uncertainty", "absorbance", func(s *Settings) any { return &s.Uncertainty.Absorbance }, declaredCodec(bounds{hi: 1, unit: "absorbance"}),
			"standard uncertainty of the absorbance baseline, shared by a spectrum; only the laboratory knows it"},
		{"uncertainty", "path_percent", func(s *Settings) any { return &s.Uncertainty.PathPercent }, declaredCodec(percent),
			"standard uncertainty of the path of the absorbance cell; only the laboratory knows it"},
		{"uncertainty", "spectral_percent", func(s *Settings) any { return &s.Uncertainty.SpectralPercent }, declaredCodec(percent),
			"standard uncertainty of the spectral factors, shared by all bottles; the certificate gives it"},
		{"uncertainty", "temperature_c", func(s *Settings) any { return &s.Uncertainty.TemperatureC }, declaredCodec(bounds{hi: 100, unit: "°C"}),
			"standard uncertainty of a bottle's temperature; only the laboratory knows it"},
	}
	for _, t := range eem.Tests {
		if hasLimit(t) {
			ks = append(ks, &key{"quality", "limit." + t.Code, func(s *Settings) any { return &s.Quality.Limit }, limitCodec(t),
				t.What + " (source: " + t.Source + ")"})
		}
	}
	return append(ks, &key{"quality", "accept", func(s *Settings) any { return &s.Quality.Accept }, acceptCodec(),
		"a known doubt that is only a note in this survey, with the reason; empty, because a doubt should be seen"},
		&key{"quality", "reject_batch", func(s *Settings) any { return &s.Quality.RejectBatch }, stepsCodec(RejectingTests),
			"tests a doubt of which rejects the whole batch; empty: a control beyond limit.control-action, no scale or more rejected bottles than limit.batch-rejected do so alone; strict charts add \"chart-rule\" (Westgard et al. 1981, from memory)"},
		&key{"quality", "alert", func(s *Settings) any { return &s.Quality.Alert }, alertCodec(),
			"a contribution of a sample above this, in the unit of the results, is told at once: flag alert, exit 3; empty, because only who asked for the survey knows what would alarm them"})
}

func reportKeys() []*key {
	line := func(name, reason string, field func(*Settings) any) *key {
		return &key{"report", name, field, text("text"), reason}
	}
	return []*key{
		line("client", "whom the report is for", func(s *Settings) any { return &s.Report.Client }),
		line("order", "the client's order", func(s *Settings) any { return &s.Report.Order }),
		line("number", "the report's own number", func(s *Settings) any { return &s.Report.Number }),
		line("method", "the laboratory's name for its method", func(s *Settings) any { return &s.Report.Method }),
		{"report", "remarks", func(s *Settings) any { return &s.Report.Remarks }, lines("text, also of several lines"),
			"printed in the report as it is"},
		line("tested_by", "who measured", func(s *Settings) any { return &s.Report.TestedBy }),
		line("approved_by", "who released the report", func(s *Settings) any { return &s.Report.ApprovedBy }),
		{"report", "decimal", func(s *Settings) any { return &s.Report.Decimal }, choice("point", "comma"),
			"decimal mark of rounded numbers in the report; the CSV files always have points"},
		{"report", "digits", func(s *Settings) any { return &s.Report.Digits }, whole(1, 3),
			"significant digits of an expanded uncertainty, to whose place it and the value are rounded; 2 after GUM (JCGM 100) 7.2.6"},
		{"report", "pictures", func(s *Settings) any { return &s.Report.Pictures }, choice("all", "flagged", "none"),
			"which bottles get their maps drawn; all takes well under a minute for 1,000"},
	}
}

// setupTables are the tables that a [setup.NAME] overrides.
var setupTables = []string{"scans", "correct", "intensity", "scatter"}

// setupKey is a key of a setup itself.
type setupKey struct {
	name   string
	field  func(*Setup) *string
	codec  codec
	reason string
}

var setupKeys = sync.OnceValue(func() []setupKey {
	return []setupKey{
		{"instrument", func(u *Setup) *string { return &u.Instrument }, text("text"), "which instrument, for the report"},
		{"bandpass", func(u *Setup) *string { return &u.Bandpass }, measureCodec("nm"), "slit widths, for the report"},
		{"integration", func(u *Setup) *string { return &u.Integration }, measureCodec("s"), "integration time, for the report"},
	}
})
