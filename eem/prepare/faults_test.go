package prepare_test

import (
	"bytes"
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/eem/synth"
)

// forty is an invented survey of 40 samples on two days, two blanks a day, on a
// coarser grid than the demo's; its detector takes any light, so that the ridges
// show their tops.
func forty(t testing.TB) *synth.Survey {
	t.Helper()
	in := synth.NewInstrument()
	in.Saturation = 0
	ex, err1 := eem.Steps(250, 450, 10)
	em, err2 := eem.Steps(270, 600, 3)
	if err1 != nil || err2 != nil {
		t.Fatal(err1, err2)
	}
	in.Grid = eem.Grid{Ex: ex, Em: em}
	s := synth.Design{Samples: 40, Levels: 1, Components: 3, Stand: 0.002, Brown: 0.05, Instrument: in, Seed: 11}.Survey()
	for i := range s.Bottles {
		b := &s.Bottles[i]
		b.Layout = synth.Layout{Form: synth.Matrix, Delimiter: ","}
		if b.Kind == "sample" {
			b.Sampled = b.Measured.Add(-30 * time.Hour)
		}
	}
	return s
}

// change is something wrong with one bottle, or with the folder.
type change struct {
	id     string // the bottle that must be flagged
	test   string
	bottle func(*synth.Bottle)
	survey func(*synth.Survey) // on the whole survey, before it is written
	folder func(t *testing.T, dir string)
	also   []string // ids that may be flagged with the same test besides
}

// spoil makes a change of raw counts.
func spoil(id, test string, f func(e *eem.EEM)) change {
	return change{id: id, test: test, bottle: func(b *synth.Bottle) { b.Spoil = func(e *eem.EEM, _ *rand.Rand) { f(e) } }}
}

// faults lists what can be wrong with one bottle of forty: S007.
func faults() []change {
	const id = "S007"
	copied := func(from, to string) func(*testing.T, string) {
		return func(t *testing.T, dir string) {
			data, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(from)))
			if err != nil {
				t.Fatal(err)
			}
			write(t, filepath.Join(dir, filepath.FromSlash(to)), string(data))
		}
	}
	return []change{
		spoil(id, "plateau", func(e *eem.EEM) {
			top := slices.Max(e.F) / 4
			for i, v := range e.F {
				e.F[i] = min(v, top)
			}
		}),
		{id: id, test: "saturated", bottle: func(b *synth.Bottle) {
			b.Spoil = func(e *eem.EEM, _ *rand.Rand) {
				for i, v := range e.F {
					e.F[i] = min(5*v, 1e6)
				}
			}
		}, folder: edited("survey.toml", "saturation = 0\n", "saturation = 1e6\n")},
		{id: id, test: "negative", bottle: func(b *synth.Bottle) {
			b.Spoil = func(e *eem.EEM, _ *rand.Rand) { // a detector that lost its offset in the red
				for i := range e.F {
					if e.Em.At(i%e.Em.Len()) > 500 {
						e.F[i] -= 2000
					}
				}
			}
		}},
		spoil(id, "spike", func(e *eem.EEM) { e.F[e.Index(14, 75)] += 3e4 }), // ex 390 / em 495 nm
		spoil(id, "scan-dropped", func(e *eem.EEM) { clear(e.Row(10)) }),
		{id: id, test: "scan-short", bottle: func(b *synth.Bottle) { b.Layout.Form = synth.Stack }, folder: func(t *testing.T, dir string) {
			name := filepath.Join(dir, "scans", "S007", "S007_ex300.txt")
			data, err := os.ReadFile(name)
			if err != nil {
				t.Fatal(err)
			}
			half := data[:len(data)/2]
			write(t, name, string(half[:bytes.LastIndexByte(half, '\n')+1]))
		}},
		spoil(id, "scan-repeated", func(e *eem.EEM) { copy(e.Row(11), e.Row(10)) }),
		spoil(id, "no-light", func(e *eem.EEM) { clear(e.F) }),
		{id: id, test: "no-light", bottle: func(b *synth.Bottle) { b.Closed = true }},
		{id: id, test: "no-light", bottle: func(b *synth.Bottle) { b.Power = 0.02 }},
		{id: id, test: "low-light", bottle: func(b *synth.Bottle) { b.Power *= 0.3 }},
		{id: id, test: "no-absorbance", bottle: func(b *synth.Bottle) { b.NoAbsorbance = true }},
		{id: id, test: "absorbance-limit", bottle: func(b *synth.Bottle) { b.Liquid.Color.At254 = 2.5 }},
		{id: id, test: "holding-time", bottle: func(b *synth.Bottle) { b.Sampled = b.Measured.Add(-20 * 24 * time.Hour) }},
		{id: id, test: "holding-time", bottle: func(b *synth.Bottle) { b.Sampled = b.Measured.Add(24 * time.Hour) }},
		{id: id, test: "excitation-repeated", bottle: func(b *synth.Bottle) { b.Layout.Form = synth.Stack }, folder: func(t *testing.T, dir string) {
			copied("scans/S007/S007_ex300.txt", "scans/S007/S007_ex310.txt")(t, dir) // the name says 310
			data := "270\t1\n300\t2\n600\t3\n"
			write(t, filepath.Join(dir, "scans", "S007", "again_ex300.txt"), data)
		}},
		{id: id, test: "unreadable", folder: func(t *testing.T, dir string) { write(t, filepath.Join(dir, "scans", "S007.csv"), "not a scan\n") }},
		{id: id, test: "same-content", folder: copied("scans/S008.csv", "scans/S007.csv"), also: []string{"S008"}},
		{id: "", test: "unused-file", folder: copied("scans/S008.csv", "scans/S099.csv")},
		{id: id, test: "unreadable", folder: transposed("scans/S007.csv")}, // the words of its header say the opposite of its light
		{id: id, test: "axes-swapped", bottle: func(b *synth.Bottle) { b.Layout.Form = synth.Long }, folder: edited("scans/S007.txt", "excitation_nm,emission_nm", "emission_nm,excitation_nm")},
		{id: "S009", test: "dilution-differs", bottle: nil, survey: func(s *synth.Survey) {
			a, b := find(s, "S007"), find(s, "S009")
			b.Liquid, b.ReplicateOf, b.Dilution = a.Liquid, a.ID, 2
			b.Spoil = func(e *eem.EEM, _ *rand.Rand) { // diluted 2.6-fold in truth
				for i := range e.F {
					e.F[i] = 60 + (e.F[i]-60)/1.3
				}
			}
		}},
		{id: id, test: "unreadable", folder: edited("runsheet.csv", "scans/S007.csv", "scans/S777.csv"), also: []string{""}},
	}
}

// edited replaces text in a file of the folder.
func edited(name, old, with string) func(*testing.T, string) {
	return func(t *testing.T, dir string) {
		path := filepath.Join(dir, filepath.FromSlash(name))
		data, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		text := strings.Replace(string(data), old, with, 1)
		if text == string(data) {
			t.Fatalf("%q is not in %s: %.60q", old, name, text)
		}
		write(t, path, text)
	}
}

func find(s *synth.Survey, id string) *synth.Bottle {
	for i := range s.Bottles {
		if s.Bottles[i].ID == id {
			return &s.Bottles[i]
		}
	}
	panic(id)
}

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// transposed names the axes of a grid file the wrong way round.
func transposed(name string) func(*testing.T, string) {
	return func(t *testing.T, dir string) {
		path := filepath.Join(dir, filepath.FromSlash(name))
		data, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSpace(string(data)), "\n")
		cells := make([][]string, len(lines))
		for i, l := range lines {
			cells[i] = strings.Split(strings.TrimSpace(l), ",")
		}
		var b strings.Builder
		for k := range cells[0] {
			for i := range cells {
				if i > 0 {
					b.WriteString(",")
				}
				b.WriteString(cells[i][k])
			}
			b.WriteString("\n")
		}
		write(t, path, b.String())
	}
}

// prepared reads a survey folder.
func prepared(t testing.TB, dir string, workers int) *prepare.Survey {
	t.Helper()
	set, err := survey.ReadSettings(filepath.Join(dir, "survey.toml"))
	if err != nil {
		t.Fatal(err)
	}
	sheet, err := survey.ReadSheet(dir, set)
	if err != nil {
		t.Fatal(err)
	}
	sv, err := prepare.Read(context.Background(), dir, sheet, set, prepare.Options{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	return sv
}

// said lists the flags as "id test".
func said(sv *prepare.Survey) map[string]int {
	out := map[string]int{}
	for _, f := range sv.Flags {
		out[f.ID+" "+f.Test]++
	}
	return out
}

// Every fault planted in one bottle of forty is flagged with its code, and what
// else is flagged is what is flagged without the fault: none of the 39 clean ones
// is touched.
func TestFaultySurveys(t *testing.T) {
	clean := t.TempDir()
	if err := forty(t).Write(clean); err != nil {
		t.Fatal(err)
	}
	before := said(prepared(t, clean, 0))
	for k := range before {
		if test, _ := eem.FindTest(strings.Fields(k)[len(strings.Fields(k))-1]); test.Severity >= eem.Doubt {
			t.Errorf("a clean survey is flagged: %s", k)
		}
	}
	// Results beside the scans are no raw files.
	for _, name := range []string{"provenance.json", "contributions.csv"} {
		dir := filepath.Join(clean, "scans", "results")
		if err := os.MkdirAll(dir, 0o755); err != nil {
			t.Fatal(err)
		}
		write(t, filepath.Join(dir, name), "{}")
	}
	if said(prepared(t, clean, 0))[" unused-file"] > 0 {
		t.Error("results are told as raw files that no row uses")
	}
	for i, c := range faults() {
		t.Run(fmt.Sprintf("%s %d", c.test, i), func(t *testing.T) {
			s := forty(t)
			if c.bottle != nil {
				c.bottle(find(s, c.id))
			}
			if c.survey != nil {
				c.survey(s)
			}
			dir := t.TempDir()
			if err := s.Write(dir); err != nil {
				t.Fatal(err)
			}
			if c.folder != nil {
				c.folder(t, dir)
			}
			sv := prepared(t, dir, 0)
			after := said(sv)
			if after[c.id+" "+c.test] == 0 {
				t.Errorf("%s of %q was not flagged: %v", c.test, c.id, flagsOf(sv, c.id))
			}
			for k := range after {
				id, _, _ := strings.Cut(k, " ")
				if before[k] == 0 && id != c.id && !slices.Contains(c.also, id) {
					t.Errorf("a clean bottle is flagged: %s", k)
				}
			}
		})
	}
}

// flagsOf lists what is said of a bottle.
func flagsOf(sv *prepare.Survey, id string) []string {
	var out []string
	for _, f := range sv.Flags {
		if f.ID == id {
			out = append(out, f.Test+": "+f.Msg)
		}
	}
	return out
}

// find2 finds a prepared bottle.
func find2(t *testing.T, sv *prepare.Survey, id string) *prepare.Bottle {
	t.Helper()
	for _, b := range sv.Bottles {
		if b.Row.ID == id {
			return b
		}
	}
	t.Fatalf("no bottle %s", id)
	return nil
}

func readText(t *testing.T, path string) string {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}
