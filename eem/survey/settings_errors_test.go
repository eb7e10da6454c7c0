package survey

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/testkit"
)

// TestSettingsErrors: every fault is told with its line and what would be right.
func TestSettingsErrors(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		// keys that are not there
		{"titel = 'x'", `survey.toml:1: titel: there is no such key; did you mean title?`},
		{"TITLE = 'x'", `survey.toml:1: TITLE: there is no such key; did you mean title?`},
		{"\n\n[scan]\nform = 'grid'", `survey.toml:3: scan: there is no such key; did you mean scans?`},
		{"[scans]\nform = 'grid'\nsaturatoin = 3", `survey.toml:3: scans.saturatoin: there is no such key; did you mean saturation?`},
		{"[scans]\nfill = 'zero'", `survey.toml:2: scans.fill: there is no such key here; fill belongs under [scatter]`},
		{"[grid]\nsomething_else = 1", `survey.toml:2: grid.something_else: there is no such key; the ones here are excitation, emission`},
		{"[scatter]\nraman.third = 'off'", `survey.toml:2: scatter.raman.third: there is no such key; the ones here are first, second`},
		{"[scatter]\nramen.first = 'off'", `survey.toml:2: scatter.ramen: there is no such key; did you mean raman?`},
		{"[scatter]\n\"raman.first\" = 'off'", `survey.toml:2: scatter."raman.first": there is no such key; the ones here are rayleigh, raman, fill`},
		{"[scans]\n[scans.form]\nx = 1", `survey.toml:2: scans.form: {x} is not allowed; write "auto", "stack", "grid", "long" or "jcamp"`},
		{"scans = 3", `survey.toml:1: scans: scans is a table; write [scans] on a line of its own and its keys below`},
		{"[[scans]]\nform = 'grid'", `survey.toml:1: scans: scans is a table; write [scans] on a line of its own and its keys below`},

		// values that are not allowed
		{"title = 3", `survey.toml:1: title: 3 is not allowed; write text`},
		{"title = 2026-05-03", `survey.toml:1: title: 2026-05-03 is not allowed; write text`},
		{"\n[scans]\nform = 'stak'", `survey.toml:3: scans.form: "stak" is not allowed: did you mean "stack"?; write "auto", "stack", "grid", "long" or "jcamp"`},
		{"[scans]\nform = 'Grid'", `survey.toml:2: scans.form: "Grid" is not allowed: did you mean "grid"?; write "auto", "stack", "grid", "long" or "jcamp"`},
		{"[scans]\nskip = 2.5", `survey.toml:2: scans.skip: 2.5 is not allowed; write a whole number from 0 to 100000`},
		{"[scans]\nskip = -1", `survey.toml:2: scans.skip: -1 is not allowed; write a whole number from 0 to 100000`},
		{"[scans]\nsaturation = nan", `survey.toml:2: scans.saturation: nan is not allowed; write a number of 0 or more, counts`},
		{"[scans]\nsaturation = +inf", `survey.toml:2: scans.saturation: +inf is not allowed; write a number of 0 or more, counts`},
		{"[scans]\nsaturation = \"65000\"", `survey.toml:2: scans.saturation: "65000" is not allowed; write a number of 0 or more, counts`},
		{"[scans]\noffset = 'none'", `survey.toml:2: scans.offset: "none" is not allowed; write a number, counts, or "auto"`},
		{"[scans]\napplied = ['spectrum']", `survey.toml:2: scans.applied: ["spectrum"] is not allowed: it holds "spectrum"; did you mean "spectral"?; write a list of "offset", "spectral", "inner-filter", "blank", "intensity", "dilution" or "scatter"`},
		{"[scans]\napplied = ['blank', 'blank']", `survey.toml:2: scans.applied: ["blank", "blank"] is not allowed: it holds "blank" twice; write a list of "offset", "spectral", "inner-filter", "blank", "intensity", "dilution" or "scatter"`},
		{"[scans]\nexcitation = '_ex{n}'", `survey.toml:2: scans.excitation: "_ex{n}" is not allowed: {nm} is missing; write a pattern with {nm}`},
		{"[grid]\nemission = {from = 600, to = 250, step = 2}", `survey.toml:2: grid.emission: {from, step, to} is not allowed: axis from 600 to 250 nm in steps of 2 nm is empty; need to ≥ from and step > 0; write {from, to, step} in nm, or "auto"`},
		{"[grid]\nemission = {from = 250, to = 600}", `survey.toml:2: grid.emission: {from, to} is not allowed: step is missing; write {from, to, step} in nm, or "auto"`},
		{"[grid]\nemission = {from = 250, to = 600, stop = 2}", `survey.toml:2: grid.emission: {from, stop, to} is not allowed: it has no key "stop"; did you mean "step"?; write {from, to, step} in nm, or "auto"`},
		{"[grid]\nemission.from = 2.5", `survey.toml:2: grid.emission: {from} is not allowed: to is missing; write {from, to, step} in nm, or "auto"`},
		{"[grid]\nemission = {from = 2.5, to = 600, step = 2}", `survey.toml:2: grid.emission: {from, step, to} is not allowed: from is 2.5 and must be a number from 150 to 1200, nm; write {from, to, step} in nm, or "auto"`},
		{"[correct]\nabsorbance_limit = 0", `survey.toml:2: correct.absorbance_limit: 0 is not allowed; write a number above 0 and up to 10, total absorbance over the measuring cell`},
		{"[correct]\nexcitation_window_cm = [0.7, 0.3]", `survey.toml:2: correct.excitation_window_cm: [0.7, 0.3] is not allowed; write [from, to] with from < to, each a number from 0 to 10, cm, or "centre"`},
		{"[correct]\ntemperature = true", `survey.toml:2: correct.temperature: true is not allowed; write "off" or {reference_c, percent_per_c}: °C and % of the fluorescence lost per °C`},
		{"[correct]\nexcitation_factors = \"c\\new.csv\"", `survey.toml:2: correct.excitation_factors: "c\new.csv" is not allowed: it holds the control character '\n' (write \ in paths as / or put the path in single quotes); write a file wavelength_nm,factor`},
		{"[intensity]\nwindow_nm = [371]", `survey.toml:2: intensity.window_nm: [371] is not allowed; write [from, to] with from < to, each a number from 150 to 1200, nm`},
		{"[intensity]\nexcitation_nm = 275", `survey.toml:2: intensity.excitation_nm: water's Raman line excited at 275 nm lies at 303 nm, outside the window; set window_nm = [288, 321]`},
		{"[scatter]\nraman.first = 10", `survey.toml:2: scatter.raman.first: 10 is not allowed; write {below, above} in nm, 0 to 300 each, the same with {from_cm, to_cm} in cm⁻¹, "auto" or "off"`},
		{"[scatter]\nraman.first = {below = -1, above = 3}", `survey.toml:2: scatter.raman.first: {above, below} is not allowed: below is -1 and must be a number from 0 to 300, nm; write {below, above} in nm, 0 to 300 each, the same with {from_cm, to_cm} in cm⁻¹, "auto" or "off"`},
		{"[scatter]\nraman.first = {below = 1, above = 3, from_cm = 4000, to_cm = 3000}", `survey.toml:2: scatter.raman.first: {above, below, from_cm, to_cm} is not allowed: from_cm must be below to_cm; write {below, above} in nm, 0 to 300 each, the same with {from_cm, to_cm} in cm⁻¹, "auto" or "off"`},
		{"[quantify]\nreferences = 'library.csv'", `survey.toml:2: quantify.references: "library.csv" is not allowed; write "auto", "standards", "none" or {file = "…"}`},
		{"[quantify]\nreferences = {file = ''}", `survey.toml:2: quantify.references: {file} is not allowed: file must name a file; write "auto", "standards", "none" or {file = "…"}`},
		{"[resolve]\ncomponents = [7, 2]", `survey.toml:2: resolve.components: [7, 2] is not allowed; write "auto", "off", a whole number, or [from, to], each from 1 to 20`},
		{"[resolve]\ncomponents = 2.5", `survey.toml:2: resolve.components: 2.5 is not allowed; write "auto", "off", a whole number, or [from, to], each from 1 to 20`},
		{"[resolve]\nchoose = 4", `survey.toml:2: resolve.choose: a number chosen by hand needs its reason; add because = "…" below it`},
		{"[resolve]\nchoose = 9\nbecause = 'x'", `survey.toml:2: resolve.choose: 9 is not among the numbers of components, 2 to 7; set components = [2, 9]`},
		{"[resolve]\nseed = -1", `survey.toml:2: resolve.seed: -1 is not allowed; write a whole number of 0 or more`},
		{"[resolve]\nscale_samples = 'yes'", `survey.toml:2: resolve.scale_samples: "yes" is not allowed; write true or false`},
		{"[uncertainty]\npath_percent = 'none'", `survey.toml:2: uncertainty.path_percent: "none" is not allowed; write a number from 0 to 100, %, or "not given"`},
		{"[correct]\nexcitation_window_cm = [0.3, 1.2]", `survey.toml:2: correct.excitation_window_cm: [0.3, 1.2] does not lie in a cell of 1 cm; correct it, or set cell_cm to the inner width of the cell`},
		{"[optics]\nyield_standard = 'Q'", `survey.toml:2: optics.yield_standard: a yield standard needs its quantum yield; add yield = … and yield_source = "…" below it`},
		{"[optics]\nyield_standard = 'Q'\nyield = 0.5", `survey.toml:3: optics.yield: a quantum yield depends on the medium; add yield_source = "medium, and where the value comes from" below it`},
		{"[correct]\nincidence_deg = 30", `survey.toml:2: correct.incidence_deg: a right-angle cell is lit and seen straight on; set inner_filter = "front-face", or leave the angles out`},
		{"[intensity]\nunit = 'a.u.'", `survey.toml:2: intensity.unit: "a.u." is not allowed: did you mean "counts"?; write "auto", "raman", "quinine" or "counts"`},
		{"[quality.limit]\nduplicates = 30", `survey.toml:2: quality.limit.duplicates: there is no such key; did you mean duplicate?`},
		{"[quality.limit]\nabsorbance-limit = 2", `survey.toml:2: quality.limit.absorbance-limit: this limit is set as correct.absorbance_limit`},
		{"[quality.limit]\nno-absorbance = 2", `survey.toml:2: quality.limit.no-absorbance: this test has no limit to set; it finds that no absorbance was given, so that the inner filter was not corrected`},
		{"[quality]\naccept = {no-absorbence = 'clear'}", `survey.toml:2: quality.accept: {no-absorbence} is not allowed: there is no test "no-absorbence"; did you mean "no-absorbance"?; write {CODE = "reason", …} with codes of ` + "`tarnlight tests --list`"},
		{"[quality.accept]\nno-light = 'dark'", `survey.toml:1: quality.accept: {no-light} is not allowed: no-light makes a number unusable and cannot be accepted; give the bottle a reason in the column exclude; write {CODE = "reason", …} with codes of ` + "`tarnlight tests --list`"},
		{"[quality]\naccept = {counts = ' '}", `survey.toml:2: quality.accept: {counts} is not allowed: counts needs a reason in words: accept = {counts = "…"}; write {CODE = "reason", …} with codes of ` + "`tarnlight tests --list`"},

		// setups
		{"[setup]\nform = 'grid'", `survey.toml:2: setup.form: a setup needs a name: write [setup.NAME] on a line of its own and its keys below`},
		{"setup = 3", `survey.toml:1: setup: setup is a table; write [setup] on a line of its own and its keys below`},
		{"[setup.b]\nscans.from = 'grid'", `survey.toml:2: setup.b.scans.from: there is no such key; did you mean form?`},
		{"[setup.b]\nscans.form = 'gird'", `survey.toml:2: setup.b.scans.form: "gird" is not allowed: did you mean "grid"?; write "auto", "stack", "grid", "long" or "jcamp"`},
		{"[setup.b]\ngrid.emission = 'auto'", `survey.toml:2: setup.b.grid: a setup cannot override this; it holds for the whole survey, under [grid]`},
		{"[setup.b]\nstarts = 3", `survey.toml:2: setup.b.starts: a setup cannot override this; it holds for the whole survey, under [resolve]`},
		{"[setup.b]\nbandwidth = 5", `survey.toml:2: setup.b.bandwidth: there is no such key; a setup has instrument, bandpass, integration and any key of scans, correct, intensity, scatter`},
		{"[setup.b]\nbandpass = -5", `survey.toml:2: setup.b.bandpass: -5 is not allowed; write text with its unit, or a number, nm`},
		{"[setup.b]\nform = 'grid'\nscans.form = 'grid'", `survey.toml:3: setup.b.scans.form: scans.form stands twice in this setup; remove one`},
		{"[setup.\" b\"]\nform = 'grid'", `survey.toml:1: setup." b": a setup's name may not be empty, begin or end with a blank, or hold control characters`},
		{"title = 'x'\n[setup.b]\nexcitation_nm = 254", `survey.toml:2: setup.b: water's Raman line excited at 254 nm lies at 278 nm, outside the window; set window_nm = [265, 293]`},

		// no TOML
		{"title = Lake", `survey.toml:1: this is no TOML: unexpected character U+004C 'L' at start of value; a setting is name = value, and text stands in quotes: title = "…"`},
		{"title = 'a'\n\ntitle = 'b'", `survey.toml:3: this is no TOML: key title is already defined; every key and table may stand only once; remove or join the second one`},
		{"[sheet]\nroot = \"C:\\data\"", `survey.toml:2: this is no TOML: invalid escape character U+0064 'd'; in double quotes \ has a meaning of its own; write paths with / or in single quotes`},
		{"t\x00i\x00", `survey.toml:1: this is no TOML: expected '=' after key; save the file as UTF-8`},
		{"title = '\xe9'", `survey.toml:1: this is no TOML: invalid UTF-8 character in literal string; save the file as UTF-8`},
	} {
		_, err := parseSettings("survey.toml", []byte(c.text))
		if fmt.Sprint(err) != c.want {
			t.Errorf("%q\n got %v\nwant %s", c.text, err, c.want)
		}
	}
}

// TestSettingsErrorsTogether: all faults are told at once, by line, twenty of them.
func TestSettingsErrorsTogether(t *testing.T) {
	_, err := parseSettings("survey.toml", []byte("[report]\ndigits = 9\n[scans]\nskip = -1\nfrom = 'grid'\n"))
	want := `survey.toml:2: report.digits: 9 is not allowed; write a whole number from 1 to 3
survey.toml:4: scans.skip: -1 is not allowed; write a whole number from 0 to 100000
survey.toml:5: scans.from: there is no such key; did you mean form?`
	if fmt.Sprint(err) != want {
		t.Errorf("got  %v\nwant %s", err, want)
	}
	var b strings.Builder
	for i := range 5_000 {
		fmt.Fprintf(&b, "key%d = 1\n", i)
	}
	start := time.Now()
	_, err = parseSettings("survey.toml", []byte(b.String()))
	lines := strings.Split(fmt.Sprint(err), "\n")
	if len(lines) != maxProblems+1 || !strings.HasPrefix(lines[maxProblems], "and ") {
		t.Errorf("%d lines, last %q", len(lines), lines[len(lines)-1])
	}
	if d := time.Since(start); d > time.Minute { // measured: 0.2 s; the race detector on a busy machine needs 50 times that
		t.Errorf("a file of %d bytes took %v", b.Len(), d)
	}
}

// FuzzSettings: no file panics or hangs, and what is read can be written and read
// back to the same bytes.
func FuzzSettings(f *testing.F) {
	for _, s := range []string{
		"", "title = 'x'", "[scans]\nform = 'grid'\noffset = 'auto'\napplied = ['blank']",
		"[scatter]\nraman.first = {below = 5, above = 9}\nfill = 'zero'", "[setup.b]\nform = 'long'\nbandpass = 5",
		"[quality]\nlimit = {duplicate = 30}\naccept = {counts = 'no blank'}", "[resolve]\ncomponents = [2, 7]\nseed = 3",
		"[grid]\nemission = {from = 250, to = 600, step = 2}", "[[a]]\nb = [[[[1]]]]", "a.a.a.a.a = {b = {c = nan}}",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		var s *Settings
		var err error
		testkit.Bounded(t, len(data), func() { s, err = parseSettings("survey.toml", data) })
		if err != nil {
			if !strings.HasPrefix(err.Error(), "survey.toml:") {
				t.Fatalf("%q: the message does not name the file: %v", data, err)
			}
			return
		}
		var once, twice strings.Builder
		if _, err := s.WriteTo(&once); err != nil {
			t.Fatal(err)
		}
		again, err := parseSettings("again.toml", []byte(once.String()))
		if err != nil {
			t.Fatalf("%q: what was written cannot be read: %v\n%s", data, err, once.String())
		}
		if _, err := again.WriteTo(&twice); err != nil {
			t.Fatal(err)
		}
		if once.String() != twice.String() {
			t.Fatalf("%q: written once\n%s\ntwice\n%s", data, once.String(), twice.String())
		}
		for name := range s.Setups {
			if _, err := s.For(name); err != nil {
				t.Fatalf("%q: setup %q: %v", data, name, err)
			}
		}
	})
}
