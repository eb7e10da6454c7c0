package survey

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"tarnlight/eem"
)

// leaves lists the addresses of all fields of v that hold a value of their own,
// by their path. Offset, Band, Range, … are values of their own: one key each.
func leaves(v reflect.Value, path string, out map[string]any) {
	for i := range v.NumField() {
		f, name := v.Field(i), path+"."+v.Type().Field(i).Name
		switch f.Addr().Interface().(type) {
		case *Offset, *Temperature, *Band, *Components, *Declared:
			out[name] = f.Addr().Interface()
			continue
		}
		if f.Kind() == reflect.Struct {
			leaves(f, name, out)
			continue
		}
		out[name] = f.Addr().Interface()
	}
}

// TestKeysAgreeWithSettings proves that every field of Settings has its key and
// every key its field.
func TestKeysAgreeWithSettings(t *testing.T) {
	s := Default()
	fields := make(map[string]any)
	leaves(reflect.ValueOf(s).Elem(), "", fields)
	delete(fields, ".Setups") // its keys are those of Setup, tested below

	seen := make(map[any]string)
	for _, k := range schema() {
		p := k.field(s)
		if q, ok := p.(*Quantify); ok { // the one key that sets two fields
			seen[&q.File] = k.full()
			p = &q.References
		}
		if other, twice := seen[p]; twice && k.table != "quality" {
			t.Errorf("%s and %s set the same field", other, k.full())
		}
		seen[p] = k.full()
	}
	for name, p := range fields {
		if _, ok := seen[p]; !ok {
			t.Errorf("field Settings%s has no key", name)
		}
		delete(seen, p)
	}
	for _, k := range seen {
		t.Errorf("key %s sets no field of Settings", k)
	}
	if n := reflect.TypeFor[Setup]().NumField() - 1; n != len(setupKeys()) { // less Set
		t.Errorf("Setup has %d fields, %d keys", n, len(setupKeys()))
	}
}

// TestKeyNamesAreUnique: a setup may write form for scans.form, which needs names
// that stand in one table only.
func TestKeyNamesAreUnique(t *testing.T) {
	seen := map[string]string{"instrument": "", "bandpass": "", "integration": ""}
	for _, k := range schema() {
		if !slices.Contains(setupTables, k.table) {
			continue
		}
		if other, ok := seen[k.name]; ok {
			t.Errorf("%s stands in %q and %q", k.name, other, k.table)
		}
		seen[k.name] = k.table
	}
}

// TestKeysHelp: every key says what it takes and why, and is listed once.
func TestKeysHelp(t *testing.T) {
	seen := make(map[string]bool)
	for _, k := range Keys() {
		id := k.Table + "." + k.Name
		if seen[id] {
			t.Errorf("%s is listed twice", id)
		}
		seen[id] = true
		if k.Type == "" || k.Default == "" || len(k.Reason) < 10 {
			t.Errorf("%s: type %q, default %q, reason %q", id, k.Type, k.Default, k.Reason)
		}
	}
}

// TestListedDefaultsAreInForce reads the defaults as listed over settings in which
// every value differs, and finds Default.
func TestListedDefaultsAreInForce(t *testing.T) {
	other := everyKeyChanged(t)
	for _, k := range schema() {
		if got := k.codec.write(k.field(other)); got == k.codec.write(k.field(Default())) {
			t.Errorf("%s: the changed settings hold the default %s", k.full(), got)
		}
	}
	for _, k := range Keys() {
		if strings.HasPrefix(k.Table, "setup") {
			continue
		}
		name := strings.TrimPrefix(k.Table+"."+k.Name, ".")
		v, err := Override{Value: k.Default}.decode()
		if err == nil {
			err = byName()[name].set(other, v)
		}
		if err != nil {
			t.Errorf("%s: the default %s: %v", name, k.Default, err)
		}
	}
	other.Setups = nil
	if d := cmp.Diff(Default(), other); d != "" {
		t.Errorf("the listed defaults are not those in force (-Default +listed):\n%s", d)
	}
}

// everyKeyChanged reads testdata/survey/every-key.toml, in which no key has its
// default, with a limit of 7.25 for every test that has one.
func everyKeyChanged(t *testing.T) *Settings {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(testdata, "every-key.toml"))
	if err != nil {
		t.Fatal(err)
	}
	limits := "[quality.limit]\n"
	for code := range defaultLimits() {
		limits += code + " = 7.25\n"
	}
	s, err := parseSettings("every-key.toml", []byte(strings.Replace(string(text), "[quality.limit]\n", limits, 1)))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

const testdata = "../../testdata/survey"

// TestEveryKey checks a file that sets every key against the values in it.
func TestEveryKey(t *testing.T) {
	got := everyKeyChanged(t)
	limits := defaultLimits()
	for code := range limits {
		limits[code] = 7.25
	}
	want := &Settings{
		Title: `Lake "north", 2 days`,
		Sheet: SheetSettings{Root: `raw\2026`, Exclusions: "exclusions.csv", Name: "{date}_{kind}_{id}", Kinds: map[string]Kind{"pw": Blank, "ct": Control}, Ignore: []string{"*.pdf", "old/*"}},
		Scans: Scans{Form: "grid", Delimiter: "semicolon", Decimal: "comma", Skip: 3, Excitation: "_ex{nm}", Across: "excitation",
			Saturation: 65000, Offset: Offset{Counts: -2.5}, Applied: []string{"offset", "spectral"}},
		Grid: GridSettings{Excitation: &Range{240, 450, 5}, Emission: &Range{250, 600, 2}},
		Correct: Correct{ExcitationFactors: "correction/ex.csv", EmissionFactors: "correction/em.csv",
			InnerFilter: "front-face", ExcitationWindowCM: [2]float64{0.3, 0.7}, EmissionWindowCM: [2]float64{0.4, 0.6},
			AbsorbanceLimit: 2, CellCM: 0.8, IncidenceDeg: 30, ObservationDeg: 22.5, Blank: "latest", BlankMaxAgeDays: 1,
			Temperature: Temperature{On: true, ReferenceC: 20, PercentPerC: 1.1}, SpectralUnits: "energy",
			LampScan: "lamp.csv", Lamp: "mercury-argon", Off: []string{"spikes"}},
		Intensity: Intensity{Unit: "raman", ExcitationNM: 275, WindowNM: [2]float64{290, 320}, Baseline: "straight"},
		Scatter: Scatter{
			Rayleigh: Orders{First: Band{Below: 20, Above: 12.5}, Second: Band{Off: true}},
			Raman:    Orders{First: Band{Below: 10, Above: 15, Auto: true}, Second: Band{FromCM: 2400, ToCM: 4650}},
			Fill:     "interpolate"},
		Optics: Optics{YieldStandard: "QS 3", Yield: Declared{true, 0.546}, YieldSource: "0.5 mol/L sulfuric acid", RefractiveIndex: 1.338,
			ExcitationNM: 347.5, WindowNM: [2]float64{375, 675}},
		Quantify: Quantify{References: "file", File: "library.csv", Limits: "limits.csv"},
		Resolve: Resolve{Components: Components{"range", 3, 5}, Choose: 4, Because: "the fifth repeats the second",
			Starts: 20, Seed: 42, Tolerance: 1e-6, SplitBy: "site", Hold: "held.csv"},
		Uncertainty: Uncertainty{Declared{true, 2}, Declared{true, 0.3}, Declared{true, 0.002}, Declared{true, 0.5},
			Declared{true, 4}, Declared{true, 0.2}},
		Quality: Quality{Limit: limits, Accept: map[string]string{"no-absorbance": "clear water, A254 below 0.02"}, RejectBatch: []string{"blank-drift"}, Alert: map[string]float64{"peat extract": 2.5, "C1": 1e-3}},
		Report:  Report{"a client", "an order", "17/2026", "M-12", "two\nlines", "one", "another", "comma", 1, "flagged"},
		Setups: map[string]*Setup{
			"lamp 2": {Instrument: "the second one", Bandpass: "5 nm", Integration: "0.5 s", Set: []Override{
				{"scans.form", `"stack"`}, {"scans.saturation", "900000"}, {"correct.emission_factors", `"correction/em2.csv"`},
				{"intensity.baseline", `"none"`}, {"scatter.rayleigh.first", "{below = 18, above = 18}"}}},
		},
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Errorf("every-key.toml (-want +got):\n%s", d)
	}
}

// TestSettingsRoundTrip writes settings and reads equal ones back.
func TestSettingsRoundTrip(t *testing.T) {
	odd := everyKeyChanged(t)
	odd.Title = "tab\there? no; quotes \" \\ and é, 水"
	odd.Title = strings.ReplaceAll(odd.Title, "\t", " ")
	odd.Scans.Offset = Offset{Auto: true}
	odd.Resolve.Tolerance = math.Nextafter(1e-7, 1)
	odd.Scans.Saturation = 1.0 / 3
	odd.Quality.Accept = map[string]string{"no-absorbance": "a", "counts": "b", "applied": `c "d"`}
	odd.Setups[`a.b "c"`] = &Setup{}
	for name, s := range map[string]*Settings{"default": Default(), "every key": everyKeyChanged(t), "odd": odd} {
		var b bytes.Buffer
		n, err := s.WriteTo(&b)
		if err != nil || n != int64(b.Len()) {
			t.Fatalf("%s: %d bytes, %v", name, n, err)
		}
		path := write(t, "settings-used.toml", b.String())
		got, err := ReadSettings(path)
		if err != nil {
			t.Fatalf("%s: %v\n%s", name, err, b.String())
		}
		if d := cmp.Diff(s, got); d != "" {
			t.Errorf("%s (-written +read):\n%s", name, d)
		}
		for _, k := range Keys() {
			if !strings.HasPrefix(k.Table, "setup") && !strings.Contains("\n"+b.String(), "\n"+k.Name+" = ") {
				t.Errorf("%s: %s is not written", name, k.Name)
			}
		}
	}
}

// TestForSetup merges a setup over the tables it may override, and nothing else.
func TestForSetup(t *testing.T) {
	s := everyKeyChanged(t)
	before := s.Scans
	got, err := s.For("lamp 2")
	if err != nil {
		t.Fatal(err)
	}
	want := *s
	want.Scans.Form, want.Scans.Saturation = "stack", 900000
	want.Correct.EmissionFactors = "correction/em2.csv"
	want.Intensity.Baseline = "none"
	want.Scatter.Rayleigh.First = Band{Below: 18, Above: 18}
	if d := cmp.Diff(&want, got); d != "" {
		t.Errorf("For (-want +got):\n%s", d)
	}
	if d := cmp.Diff(before, s.Scans); d != "" {
		t.Errorf("For changed its receiver:\n%s", d)
	}
	if same, err := s.For(""); err != nil || same != s {
		t.Errorf("For(\"\") = %v, %v; want the settings themselves", same, err)
	}
	_, err = s.For("lamp2")
	if want := `the settings have no table [setup.lamp2]; did you mean "lamp 2"?`; fmt.Sprint(err) != want {
		t.Errorf("error %q, want %q", err, want)
	}
	s.Setups["x"] = &Setup{Set: []Override{{"scans.form", `"stak"`}}}
	if _, err = s.For("x"); err == nil {
		t.Error("a setup with an override that is not allowed was merged")
	}
}

// TestSpellings: TOML allows one setting to be written in many ways.
func TestSpellings(t *testing.T) {
	want := Default()
	want.Scatter.Raman.First = Band{Below: 5, Above: 9}
	want.Setups = map[string]*Setup{"b": {Set: []Override{{"scans.form", `"long"`}, {"scatter.raman.second", `"off"`}}}}
	setup := "\n[setup.b]\nscans.form = \"long\"\nscatter.raman.second = \"off\"\n"
	for _, text := range []string{
		"[scatter]\nraman.first = {below = 5, above = 9}" + setup,
		"[scatter]\nraman = {first = {below = 5, above = 9.0}}" + setup,
		"scatter.raman.first = {below = 5, above = 9}" + setup,
		"[scatter.raman]\nfirst.below = 5\nfirst.above = 9" + setup,
		"[scatter.raman.first]\nbelow = 5\nabove = 9" + setup,
		"\ufeffscatter = {raman = {first = {below = 5, above = 9}}}\n[setup]\nb = {scans = {form = 'long'}, raman = {second = 'off'}}",
		"[setup.b.scatter.raman]\nsecond = \"off\"\n[setup.b.scans]\nform = \"long\"\n[scatter]\nraman.first = {above = 9, below = 5}\r\n",
		"[setup.b]\nform = \"long\"\nraman.second = \"off\"\n[scatter]\nraman.first = {above = 9, below = 5}",
	} {
		got, err := parseSettings("survey.toml", []byte(text))
		if err != nil {
			t.Errorf("%s\n%v", text, err)
			continue
		}
		if d := cmp.Diff(want, got); d != "" {
			t.Errorf("%s\n(-want +got):\n%s", text, d)
		}
	}
}

func TestComponents(t *testing.T) {
	for text, want := range map[string]Components{
		`"auto"`: {"auto", 2, 7}, `"off"`: {Mode: "off"}, `4`: {"range", 4, 4}, `[2, 7]`: {"range", 2, 7}, `[3, 3]`: {"range", 3, 3},
	} {
		s, err := parseSettings("survey.toml", []byte("[resolve]\ncomponents = "+text))
		if err != nil {
			t.Errorf("%s: %v", text, err)
		} else if s.Resolve.Components != want {
			t.Errorf("%s: %v, want %v", text, s.Resolve.Components, want)
		}
	}
}

func TestSettingsFile(t *testing.T) {
	dir := t.TempDir()
	s, err := ReadSettings(filepath.Join(dir, "survey.toml"))
	if err != nil || !cmp.Equal(s, Default()) {
		t.Errorf("missing file: %v, %v; want the defaults", s, err)
	}
	empty := write(t, "survey.toml", "")
	if s, err = ReadSettings(empty); err != nil || !cmp.Equal(s, Default()) {
		t.Errorf("empty file: %v, %v; want the defaults", s, err)
	}
	if _, err = ReadSettings(dir); err == nil || !strings.Contains(err.Error(), "must be a file") {
		t.Errorf("folder: %v", err)
	}
	big := write(t, "big.toml", "#"+strings.Repeat("x", maxSettings))
	if _, err = ReadSettings(big); err == nil || !strings.Contains(err.Error(), "too many") {
		t.Errorf("big file: %v", err)
	}
}

// TestQualityLimits: limits of tests are the ones in eem.Tests, but for what the
// file says.
func TestQualityLimits(t *testing.T) {
	s, err := parseSettings("survey.toml", []byte("[quality]\nlimit = {duplicate = 30}"))
	if err != nil {
		t.Fatal(err)
	}
	for _, test := range eem.Tests {
		got, ok := s.Quality.Limit[test.Code]
		want := test.Limit
		if test.Code == "duplicate" {
			want = 30
		}
		if ok != hasLimit(test) || (ok && got != want) {
			t.Errorf("%s: limit %g, %v; want %g", test.Code, got, ok, want)
		}
	}
}

func write(t testing.TB, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}
