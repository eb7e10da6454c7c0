package survey

// Settings is everything that can be set for a survey, with the value in force.
// Default gives the values that hold where a survey says nothing. Paths are
// relative to the survey folder unless said otherwise.
type Settings struct {
	Title       string
	Sheet       SheetSettings
	Scans       Scans
	Grid        GridSettings
	Correct     Correct
	Intensity   Intensity
	Scatter     Scatter
	Optics      Optics
	Quantify    Quantify
	Resolve     Resolve
	Uncertainty Uncertainty
	Quality     Quality
	Report      Report
	Setups      map[string]*Setup // by name; nil when there are none
}

// SheetSettings says where raw files lie and how the run sheet is completed.
type SheetSettings struct {
	Root       string // folder that scans and absorbance cells are relative to; empty: the survey folder
	Exclusions string // CSV of id, reason that is merged by id; empty: none
	Name       string // pattern by which begin reads ids, kinds and batches from file names; empty: none
	// Kinds are the laboratory's own words for kinds, in lower case: what {kind} of
	// Name stands for or, where Name has none, the letters that an id begins with.
	Kinds map[string]Kind
	// Ignore are patterns of files and folders that nobody takes for raw files.
	Ignore []string
}

// Scans says how raw scan files are read.
type Scans struct {
	Form       string  // auto, stack, grid, long, jcamp
	Delimiter  string  // auto, comma, semicolon, tab, blank
	Decimal    string  // auto, point, comma
	Skip       int     // lines to skip at the top of every file
	Excitation string  // pattern that finds the excitation in a file name, such as "_ex{nm}"; empty: content and common forms
	Across     string  // what runs across a grid file: auto, excitation, emission
	Saturation float64 // counts at which the detector clips; 0: none stated
	Offset     Offset
	Applied    []string // corrections done to the files before they came here, of AppliedSteps
}

// AppliedSteps are the names that scans.applied may hold, in the order of the
// corrections.
var AppliedSteps = []string{"offset", "spectral", "inner-filter", "blank", "intensity", "dilution", "scatter"}

// Offset is the detector's reading without light, counts.
type Offset struct {
	Auto   bool // estimate it from the data; Counts is then what was found
	Counts float64
}

// Range is from, from+step, …, to, nm.
type Range struct {
	From, To, Step float64
}

// GridSettings states the survey's grid. A nil Range is the axis of the most
// samples.
type GridSettings struct {
	Excitation, Emission *Range
}

// Correct holds the corrections from counts to comparable fluorescence.
type Correct struct {
	ExcitationFactors, EmissionFactors string // files "wavelength_nm,factor"; empty: not corrected

	InnerFilter string // right-angle, front-face, transmission, none
	// The windows that the detector sees, cm from the wall where light enters
	// (excitation) and from the wall where it leaves (emission). Zero means the
	// centre form, all light made and seen in the middle of a 1 cm cell.
	ExcitationWindowCM, EmissionWindowCM [2]float64
	AbsorbanceLimit                      float64 // total absorbance, excitation + emission, over the measuring cell
	CellCM                               float64 // inner width of the measuring cell, cm
	// Angles in air, degrees from the normal of the cell's face, at which light of a
	// front-face or transmission geometry enters and is seen.
	IncidenceDeg, ObservationDeg float64

	Blank           string  // batch-mean, listed, latest, none
	BlankMaxAgeDays float64 // how old a blank may be for "latest"; 0: any age
	Temperature     Temperature
	SpectralUnits   string   // photons, energy: what the factors bring intensities to
	LampScan, Lamp  string   // scan of a line lamp that checks the wavelengths, empty: none; mercury, mercury-argon
	Off             []string // steps, of OffSteps, that are not done
}

// OffSteps are the names of the steps that correct.off may hold, in their order.
// Tests that change nothing are no steps; quality.accept quiets them.
var OffSteps = []string{"saturation", "dropped-scans", "spikes", "offset", "spectral", "inner-filter", "blank", "intensity",
	"temperature", "dilution", "scatter"}

// Temperature brings fluorescence to a reference temperature by
// F / (1 − PercentPerC/100·(T − ReferenceC)). The zero value is off.
type Temperature struct {
	On          bool
	ReferenceC  float64 // °C
	PercentPerC float64 // loss per °C of warming, % of the value at the reference
}

// Intensity says in which unit fluorescence is given.
type Intensity struct {
	Unit         string     // auto, raman, quinine, counts
	ExcitationNM float64    // of the Raman line that sets the scale
	WindowNM     [2]float64 // emission, over which that line is integrated
	Baseline     string     // none, straight
}

// Scatter holds the bands that are removed around the scatter lines.
type Scatter struct {
	Rayleigh, Raman Orders
	Fill            string // missing, interpolate, zero
}

// Orders are the bands of first and second order.
type Orders struct {
	First, Second Band
}

// Band is the stretch of emission removed around a scatter line, nm on both
// sides. With Auto the widths are found in the data and Below and Above are the
// stated ones that hold until then; with Off nothing is removed.
type Band struct {
	Below, Above float64
	FromCM, ToCM float64 // cm⁻¹, of a Raman band that is stretched over these shifts; 0 of another
	Auto, Off    bool
}

// Optics says how the apparent quantum yield of the water is found: against a
// standard of the run sheet. Nothing is known of it while YieldStandard is empty.
type Optics struct {
	YieldStandard   string     // id of the bottle that the yields rest on
	Yield           Declared   // quantum yield of that standard in its medium
	YieldSource     string     // medium, and where the yield comes from
	RefractiveIndex float64    // of its medium
	ExcitationNM    float64    // at which both are compared
	WindowNM        [2]float64 // emission, over which both are integrated
}

// Quantify says what samples are quantified against.
type Quantify struct {
	References string // auto, standards, none, file
	File       string // of references, when References is "file"
	Limits     string // CSV of the laboratory's own detection limits; empty: none
}

// Resolve says how components are found that nobody gave us.
type Resolve struct {
	Components   Components
	Choose       int    // number of components to report; 0: the largest that passes
	Because      string // why, in words, when Choose is set
	Starts       int
	Seed         uint64
	Tolerance    float64 // a start stops when the loss falls by less than this, relative
	ScaleSamples bool    // fit samples at unit norm
	SplitBy      string  // run-sheet column whose values keep together in split halves; empty: by the order of the sheet
	Hold         string  // reference file of components whose spectra are held; empty: none
}

// Components is the range of the number of components.
type Components struct {
	Mode     string // auto, off, range
	From, To int    // both ends included, for auto too
}

// Declared is a number that the laboratory may declare.
type Declared struct {
	Given bool
	Value float64
}

// Uncertainty holds standard uncertainties that the laboratory declares. What is
// not given stands in the budget as such.
type Uncertainty struct {
	StandardsPercent Declared // of a standard's concentration, shared by a component's levels
	DilutionPercent  Declared // of a dilution factor
	Absorbance       Declared // of an absorbance, dimensionless, shared by a spectrum (baseline)
	PathPercent      Declared // of the absorbance cell's path
	SpectralPercent  Declared // of the spectral factors, shared by all bottles
	TemperatureC     Declared // of a bottle's temperature, °C
}

// Quality holds limits of tests and doubts accepted, both by the codes of
// eem.Tests.
type Quality struct {
	Limit  map[string]float64 // limit in force of every test that has one, but for correct.absorbance_limit
	Accept map[string]string  // code → reason: the doubt is only a note here; nil when none is
	// RejectBatch are tests, of RejectingTests, a doubt of which rejects the batch.
	RejectBatch []string
	Alert       map[string]float64 // component → contribution above which a sample is told at once; nil when none is
}

// RejectingTests are the tests on blanks and quality samples that
// quality.reject_batch may hold.
var RejectingTests = []string{"blank-drift", "blank-level", "chart-rule", "control-recovery", "duplicate", "field-duplicate", "lamp-lines",
	"no-blank", "raman-law", "spike-recovery", "standard-recovery", "wavelength"}

// Report holds what goes on the report as it is, and how numbers look there.
type Report struct {
	Client, Order, Number, Method, Remarks, TestedBy, ApprovedBy string

	Decimal  string // point, comma
	Digits   int    // significant digits of an expanded uncertainty
	Pictures string // all, flagged, none
}

// Setup is one instrument or state of it. Set overrides keys of the tables scans,
// correct, intensity and scatter for the rows that name it.
type Setup struct {
	Instrument  string
	Bandpass    string // as the laboratory states it, with unit
	Integration string // as the laboratory states it, with unit
	Set         []Override
}

// Override is one setting of a Setup.
type Override struct {
	Key   string // "scans.form", …
	Value string // as TOML
}

// Key describes one setting for `settings --list`.
type Key struct {
	Table   string // "scans"; empty for a key at the top; "setup.NAME" for those of a setup
	Name    string // "form", "rayleigh.first"
	Type    string // type and what is allowed
	Default string // as TOML
	Reason  string // what it does and why the default is what it is, in one sentence
}
