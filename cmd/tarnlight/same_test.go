package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// demoFolder writes the invented survey with a change to its run sheet.
func demoFolder(t *testing.T, change func(rows []string) []string) string {
	t.Helper()
	dir := t.TempDir()
	if err := synth.Demo(1).Write(dir); err != nil {
		t.Fatal(err)
	}
	if change != nil {
		rows := strings.Split(strings.TrimSpace(read(t, dir, "runsheet.csv")), "\n")
		put(t, dir, "runsheet.csv", strings.Join(change(rows), "\n")+"\n")
	}
	return dir
}

func runNoPictures(t *testing.T, dir string, args ...string) {
	t.Helper()
	call(append([]string{"run", dir, "--pictures=false"}, args...)...).want(t, exitDone, exitDoubt)
}

// rowsOf returns the rows of a results table by id, without one bottle.
func rowsOf(t *testing.T, dir, name, without string) []string {
	t.Helper()
	tab := table(t, dir, "out", name)
	var out []string
	for _, r := range tab.Rows {
		if r[tab.Col("id")] != without {
			out = append(out, strings.Join(r, "|"))
		}
	}
	return out
}

func sameRows(t *testing.T, what string, a, b []string) {
	t.Helper()
	if len(a) != len(b) {
		t.Errorf("%s: %d rows against %d", what, len(a), len(b))
		return
	}
	bad := 0
	for i := range a {
		if a[i] != b[i] {
			if bad++; bad <= 2 {
				t.Errorf("%s, row %d:\n%s\n%s", what, i, a[i], b[i])
			}
		}
	}
}

// A blank turned into a field blank changes no other row: it is as if it were not
// there.
func TestFieldBlankIsNoBlank(t *testing.T) {
	testkit.Heavy(t)
	id := ""
	turned := demoFolder(t, func(rows []string) []string {
		for i, r := range rows {
			if f := strings.Split(r, ","); id == "" && f[1] == "blank" {
				id = f[0]
				rows[i] = strings.Replace(r, ",blank,", ",field-blank,", 1)
			}
		}
		return rows
	})
	if id == "" {
		t.Fatal("the demo has no blank")
	}
	gone := demoFolder(t, func(rows []string) []string {
		var out []string
		for _, r := range rows {
			if !strings.HasPrefix(r, id+",") {
				out = append(out, r)
			}
		}
		return out
	})
	runNoPictures(t, turned)
	runNoPictures(t, gone)
	sameRows(t, "contributions", rowsOf(t, turned, "contributions.csv", id), rowsOf(t, gone, "contributions.csv", id))
	sameRows(t, "samples", rowsOf(t, turned, "samples.csv", id), rowsOf(t, gone, "samples.csv", id))
}

// Results do not depend on how many bottles are worked on at a time.
func TestWorkersDoNotMatter(t *testing.T) {
	dir := demoFolder(t, nil)
	put(t, dir, "survey.toml", read(t, dir, "survey.toml")+"\n")
	runNoPictures(t, dir, "--workers", "1")
	first := map[string]string{}
	names := []string{"contributions.csv", "samples.csv", "components.csv", "flags.csv", "survey.nc", "model.json", "status.json", "provenance.json"}
	for _, n := range names {
		first[n] = read(t, dir, "out", n)
	}
	runNoPictures(t, dir, "--workers", "8")
	for _, n := range names {
		if read(t, dir, "out", n) != first[n] {
			t.Errorf("%s differs with 8 workers", n)
		}
	}
}

// The absorbance given of the diluted and of the undiluted liquid is the same
// liquid: brought to what was scanned, both give the same row.
func TestAbsorbanceDilution(t *testing.T) {
	testkit.Heavy(t)
	rows := map[string][]string{}
	for _, diluted := range []bool{false, true} {
		dir := folder(t, nil)
		if err := synth.Demo(1).Write(dir); err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSpace(read(t, dir, "runsheet.csv")), "\n")
		head := strings.Split(lines[0], ",")
		at := func(name string) int {
			for i, h := range head {
				if h == name {
					return i
				}
			}
			t.Fatalf("no column %s in %v", name, head)
			return 0
		}
		target := ""
		for i, l := range lines[1:] {
			f := strings.Split(l, ",")
			if len(f) > at("absorbance") && f[at("kind")] == "sample" && f[at("absorbance")] != "" && f[at("dilution")] == "" && target == "" {
				target = f[at("id")]
				file := f[at("absorbance")]
				scaled := scaleAbsorbance(t, read(t, dir, filepath.FromSlash(file)), 1)
				d := "1"
				if diluted {
					scaled = scaleAbsorbance(t, read(t, dir, filepath.FromSlash(file)), 0.25)
					d = "4"
				}
				put(t, dir, file, scaled)
				lines[i+1] = l + "," + d
			} else {
				lines[i+1] = l + ","
			}
		}
		lines[0] += ",absorbance_dilution"
		put(t, dir, "runsheet.csv", strings.Join(lines, "\n")+"\n")
		runNoPictures(t, dir)
		c := table(t, dir, "out", "contributions.csv")
		for _, r := range c.Rows {
			if r[0] == target {
				rows[fmt.Sprint(diluted)] = append(rows[fmt.Sprint(diluted)], strings.Join(r, "|"))
			}
		}
	}
	if len(rows["true"]) == 0 {
		t.Fatal("no row of the bottle")
	}
	sameRows(t, "absorbance of the diluted liquid", rows["true"], rows["false"])
}

// scaleAbsorbance multiplies the second column; a power of two keeps every digit.
func scaleAbsorbance(t *testing.T, text string, by float64) string {
	t.Helper()
	lines := strings.Split(strings.TrimSpace(text), "\n")
	for i, l := range lines {
		f := strings.FieldsFunc(l, func(r rune) bool { return r == ',' || r == '\t' })
		if len(f) != 2 || math.IsNaN(parse(f[1])) {
			continue
		}
		lines[i] = f[0] + "," + fmt.Sprint(parse(f[1])*by)
	}
	return strings.Join(lines, "\n") + "\n"
}

func parse(s string) float64 {
	var v float64
	if _, err := fmt.Sscan(s, &v); err != nil {
		return math.NaN()
	}
	return v
}

// Bottles of two instruments (other form of files, other response, other
// saturation) in one survey have the rows that each half has alone against the
// same references.
func TestSetupsAreIndependent(t *testing.T) {
	testkit.Heavy(t)
	sv := synth.Demo(1)
	other := *sv.Instrument
	other.Lamp = synth.Band{synth.PeakAt(420, 9000, 1)}
	other.Detector = synth.Band{synth.PeakAt(480, 8000, 1)}
	other.Gain *= 0.7
	other.Saturation = 0.8 * sv.Instrument.Saturation
	sv.Setups = map[string]*synth.Instrument{"two": &other}
	for i := range sv.Bottles {
		if b := &sv.Bottles[i]; b.Measured.Day() == sv.Bottles[len(sv.Bottles)-1].Measured.Day() {
			b.Setup = "two"
			b.Layout = synth.Layout{Form: synth.Long, Delimiter: ";", DecimalComma: true}
		}
	}
	whole := t.TempDir()
	if err := sv.Write(whole); err != nil {
		t.Fatal(err)
	}
	runNoPictures(t, whole) // its standards make the references
	model := read(t, whole, "out", "model.json")
	settings := read(t, whole, "survey.toml") + "\n[quantify]\nreferences = { file = \"model.json\" }\n"
	rows := strings.Split(strings.TrimSpace(read(t, whole, "runsheet.csv")), "\n")
	at := slices.Index(strings.Split(rows[0], ","), "setup")
	if at < 0 {
		t.Fatalf("no setup column: %s", rows[0])
	}
	half := func(keep func(setup string) bool) (dir string, n int) {
		dir = t.TempDir()
		if err := sv.Write(dir); err != nil {
			t.Fatal(err)
		}
		out := rows[:1:1]
		for _, r := range rows[1:] {
			if keep(strings.Split(r, ",")[at]) {
				out = append(out, r)
			}
		}
		put(t, dir, "runsheet.csv", strings.Join(out, "\n")+"\n")
		put(t, dir, "model.json", model)
		put(t, dir, "survey.toml", settings)
		runNoPictures(t, dir)
		return dir, len(out) - 1
	}
	all, n := half(func(string) bool { return true })
	one, n1 := half(func(s string) bool { return s == "" })
	two, n2 := half(func(s string) bool { return s == "two" })
	if n1 == 0 || n2 == 0 || n1+n2 != n {
		t.Fatalf("%d bottles in halves of %d and %d", n, n1, n2)
	}
	for _, name := range []string{"contributions.csv", "samples.csv"} {
		apart := append(rowsOf(t, one, name, ""), rowsOf(t, two, name, "")...)
		together := rowsOf(t, all, name, "")
		// What the model misses is looked for in all bottles together.
		unknown := func(row string) bool { return strings.Contains(row, "|unexplained|") }
		apart, together = slices.DeleteFunc(apart, unknown), slices.DeleteFunc(together, unknown)
		slices.Sort(apart)
		slices.Sort(together)
		sameRows(t, name, together, apart)
	}
}
