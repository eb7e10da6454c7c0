package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
	"tarnlight/unmix/report"
)

const yieldSettings = `[optics]
yield_standard = "QS"
yield = 0.5
yield_source = "invented"
[quality]
limit = {yield-standard = 0.005}
`

// yieldFolder is a survey with a standard of yield 0.5 and three waters; one of them
// has no absorbance.
func yieldFolder(t *testing.T, settings string) (string, *synth.Survey) {
	t.Helper()
	peat, bright := synth.Substance("peat extract"), synth.Substance("brightener")
	bright.Inert = synth.Tail{} // all that it absorbs may become light
	s := &synth.Survey{Title: "Invented yields", Seed: 5, Instrument: synth.NewInstrument(), Photometer: synth.NewPhotometer(),
		Components: []*synth.Fluorophore{peat, bright}, Settings: settings}
	// Dim water needs a photometer whose error is small beside an absorbance of 0.02.
	s.Photometer.Noise, s.Photometer.Baseline = 1e-5, 1e-5
	dose := func(amount float64) []synth.Dose { return []synth.Dose{{Of: peat, Amount: amount}} }
	quinine := []synth.Dose{{Of: bright, Amount: 60}}
	for n, b := range []synth.Bottle{
		{ID: "PW1", Kind: "blank", NoAbsorbance: true}, {ID: "PW2", Kind: "blank", NoAbsorbance: true}, {ID: "PW3", Kind: "blank", NoAbsorbance: true},
		{ID: "P1", Kind: "standard", Liquid: synth.Liquid{Doses: dose(4)}, Known: dose(4)},
		{ID: "P2", Kind: "standard", Liquid: synth.Liquid{Doses: dose(8)}, Known: dose(8)},
		{ID: "QS", Kind: "standard", Liquid: synth.Liquid{Doses: quinine}, Known: quinine},
		{ID: "W1", Kind: "sample", Liquid: synth.Liquid{Doses: dose(5)}},
		{ID: "W2", Kind: "sample", Liquid: synth.Liquid{Doses: dose(5), Color: synth.Tail{At254: 0.3, Slope: 0.014}}},
		{ID: "W3", Kind: "sample", Liquid: synth.Liquid{Doses: dose(5)}, NoAbsorbance: true},
	} {
		b.Measured = time.Date(2031, time.May, 6, 8, 5*n, 0, 0, time.UTC)
		b.Layout.Form = synth.Matrix
		s.Bottles = append(s.Bottles, b)
	}
	dir := t.TempDir()
	if err := s.Write(dir); err != nil {
		t.Fatal(err)
	}
	return dir, s
}

// The yields that the simulator was given come back from its raw counts: the light
// that a water gives for all that it absorbs at 350 nm, in the window that is
// integrated; within 1 % where the blank alone took the Raman line out, within 2 %
// where its band was cut out of the standard's steep edge and bridged. What has no
// absorbance is refused with the reason, in the flags.
func TestQuantumYield(t *testing.T) {
	for settings, tol := range map[string]float64{"": 0.02, "[scatter]\nraman.first = \"off\"\n": 0.01} {
		dir, s := yieldFolder(t, yieldSettings+settings)
		call("quantify", dir, "--pictures=false").want(t, exitDoubt)
		samples := table(t, dir, "out", "samples.csv")
		peat, bright := s.Components[0], s.Components[1]
		// Of each substance's light, as much as lies in 370–600 nm counts.
		share := inWindow(peat.Emits) / inWindow(bright.Emits)
		for _, b := range s.Bottles[6:8] {
			want := peat.Yield * share * 5 * peat.Absorbs.At(350) / b.Liquid.AbsorbanceAt(350)
			got := number(t, cell(t, samples, "quantum_yield", "id", b.ID))
			if math.Abs(got/want-1) > tol {
				t.Errorf("%s: quantum yield %.5f, the simulator's is %.5f", b.ID, got, want)
			}
		}
		if got := number(t, cell(t, samples, "quantum_yield", "id", "QS")); math.Abs(got-0.5) > 1e-12 {
			t.Errorf("the standard against itself: %g", got)
		}
		if got := cell(t, samples, "quantum_yield", "id", "W3"); got != "" {
			t.Errorf("a bottle without absorbance has the yield %s", got)
		}
		flags := table(t, dir, "out", "flags.csv")
		if msg := cell(t, flags, "message", "test", "index-refused"); !strings.Contains(msg, "quantum_yield for 1 of 3 samples (W3: no absorbance is given)") {
			t.Error(msg)
		}
		if got := cell(t, flags, "severity", "id", "QS", "test", "yield-standard"); got != "note" {
			t.Errorf("the standard's absorbance is %s", got)
		}
	}
}

// inWindow is the share of an emission that lies in 370–600 nm.
func inWindow(b synth.Band) float64 {
	sum := 0.0
	for nm := 370.0; nm <= 600; nm++ {
		sum += b.At(nm)
	}
	return sum / b.Area()
}

// A yield that cannot be had is refused with the reason, for the survey or for all
// its bottles.
func TestQuantumYieldRefused(t *testing.T) {
	for _, c := range []struct{ name, old, with, want string }{
		{"no such row", `"QS"`, `"QX"`, `survey.toml: optics.yield_standard: runsheet.csv has no row with the id "QX"`},
		{"energy units", "[correct]\n", "[correct]\nspectral_units = \"energy\"\n", "a yield counts photons"},
		{"no factors", "[correct]\n", "[correct]\noff = [\"spectral\"]\n", "not spectrally corrected"},
		{"no absorbance of the standard", `"QS"`, `"W3"`, "yield standard W3: "},
		{"window beyond the scans", "yield = 0.5", "yield = 0.5\nyield_window_nm = [370, 650]", "no value at ex 350, em 650"},
	} {
		dir, _ := yieldFolder(t, yieldSettings)
		put(t, dir, "survey.toml", strings.Replace(read(t, dir, "survey.toml"), c.old, c.with, 1))
		r := call("quantify", dir, "--pictures=false")
		if r.code == exitFailed {
			if !strings.Contains(r.err, c.want) {
				t.Errorf("%s: %s", c.name, r.err)
			}
			continue
		}
		if msg := cell(t, table(t, dir, "out", "flags.csv"), "message", "test", "index-refused"); !strings.Contains(msg, c.want) {
			t.Errorf("%s: %s", c.name, msg)
		}
	}
}

// Every index of the water has a column that the results describe.
func TestOpticsColumns(t *testing.T) {
	y := newTiny()
	dir := y.write(t)
	call("quantify", dir, "--pictures=false").want(t, exitDone, exitDoubt)
	samples := table(t, dir, "out", "samples.csv")
	for column := range opticsNames {
		if samples.Own(column) < 0 {
			t.Errorf("samples.csv has no column %s", column)
		}
	}
}

// The eight published indices of 33 drip waters, read by the command's own readers
// from grid files (whose emission axis is rounded to 1e-4 nm) to 1e-5, peak b, read
// between rows that nearly cancel, to 5e-4; the two waters that are there as stacked
// scans too give the same, and so do the columns of samples.csv. Endres et al. 2023,
// Quaternary Research, doi:10.1017/qua.2023.41.
func TestCaveIndices(t *testing.T) {
	data := testkit.Shared(t, "data", "cave_dripwater")
	published, err := report.ReadTable(filepath.Join(data, "published_indices.csv"))
	if err != nil {
		t.Fatal(err)
	}
	columns := map[string]string{"fi": "fluorescence_index_first", "bix": "biological_index", "hix": "humification_index",
		"b": "peak_b", "t": "peak_t", "a": "peak_a", "m": "peak_m", "c": "peak_c"}
	stacks, err := filepath.Glob(filepath.Join(data, "stacked_scans", "*"))
	if err != nil || len(stacks) != 2 {
		t.Fatal(stacks, err)
	}
	sheet := "id,kind,scans\n"
	for _, row := range published.Rows {
		id := row[published.Col("sample")]
		sheet += fmt.Sprintf("%s,sample,eem/%s.csv\n", id, id)
	}
	for _, dir := range stacks {
		sheet += fmt.Sprintf("%s scans,sample,stacked_scans/%s\n", filepath.Base(dir), filepath.Base(dir))
	}
	dir := folder(t, map[string]string{"runsheet.csv": sheet, "survey.toml": fmt.Sprintf("[sheet]\nroot = %q\n", data) + `[scans]
applied = ["offset", "spectral", "inner-filter", "blank", "intensity", "dilution", "scatter"]
[intensity]
unit = "raman"
`})
	j := &job{jobOptions: jobOptions{dir: dir}, bar: newBar(io.Discard)}
	if err := j.readInputs(); err != nil {
		t.Fatal(err)
	}
	if err := j.prepare(context.Background()); err != nil {
		t.Fatal(err)
	}
	got := map[string]map[string]float64{} // by bottle and column
	for _, b := range j.sv.Bottles {
		row := map[string]float64{}
		j.opticsColumns(func(column string, v any) { row[column] = v.(float64) }, b)
		got[b.Row.ID] = row
	}
	worst := map[string]float64{}
	compared := 0
	for _, row := range published.Rows {
		id := row[published.Col("sample")]
		for name, column := range columns {
			v, has := got[id][column]
			if id == "GLO_200807_m210714" { // entirely zero, as published
				if has && v != 0 {
					t.Errorf("%s, all zero: %s is %g", id, column, v)
				}
				continue
			}
			want := number(t, row[published.Col(name)])
			limit := 1e-5
			if name == "b" {
				limit = 5e-4
			}
			// One published b is −4e−16, the rounding error of a zero.
			if d := math.Abs(v-want) - 1e-15; !has || d > limit*math.Abs(want) {
				t.Errorf("%s: %s %.10g, published %.10g", id, column, v, want)
			} else if want > 1e-12 {
				worst[name] = max(worst[name], d/want)
			}
			compared++
			if again, ok := got[id+" scans"]; ok && math.Abs(again[column]-v) > 1e-6*math.Abs(v) { // eight digits there
				t.Errorf("%s: %s is %.10g from scans, %.10g from the grid", id, column, again[column], v)
			}
		}
	}
	t.Logf("%d indices, largest relative departures %v", compared, worst)
	if compared != 32*8 {
		t.Errorf("%d indices were compared", compared)
	}
}
