package scanfile

import (
	"maps"
	"strings"
	"testing"
)

func TestPattern(t *testing.T) {
	for _, c := range []struct {
		pattern, name string
		want          map[string]string // nil: no match
	}{
		{"{id}_ex{nm}", "scans/day1/S1_ex240.txt", map[string]string{"id": "S1", "nm": "240"}},
		{"{id}_ex{nm}", "S1_a_EX240.5", map[string]string{"id": "S1_a", "nm": "240.5"}},
		{"{id}_ex{nm}", "S1_ex240,5.csv", map[string]string{"id": "S1", "nm": "240.5"}},
		{"{id}_ex{nm}.txt", "S1_ex240.txt", map[string]string{"id": "S1", "nm": "240"}},
		{"{id}_ex{nm}", "S1_em240.txt", nil},
		{"{date}_{kind}_{id}_{n}", "2026-05-03_field-blank_Bach 7_02.csv", map[string]string{"date": "2026-05-03", "kind": "field-blank", "id": "Bach 7", "n": "02"}},
		{"{date}_{id}", "20260503_x.csv", map[string]string{"date": "2026-05-03", "id": "x"}},
		{"{date}_{id}", "20261503_x.csv", nil},
		{"{date}/{id}_*", "raw/2026_05_03/Weiher é_scan.txt", map[string]string{"date": "2026-05-03", "id": "Weiher é"}},
		{"{date}/{id}_*", "Weiher_scan.txt", nil},
		{"S*_{n}", "S_old_4.txt", map[string]string{"n": "4"}},
		{"a.b(c)+[d]", "a.b(c)+[d]", map[string]string{}},
		{"{id}", "only/S1.final.csv", map[string]string{"id": "S1.final"}},
	} {
		p, err := CompilePattern(c.pattern)
		if err != nil {
			t.Fatal(err)
		}
		got, ok := p.Match(c.name)
		if ok != (c.want != nil) || !maps.Equal(got, c.want) {
			t.Errorf("%q on %q: %v %v, want %v", c.pattern, c.name, got, ok, c.want)
		}
	}
	for pattern, want := range map[string]string{"": "1 to 255", "{x}": "{kind}", "{nm}_{nm}": "twice", "{nm": "placeholder", "nm}": "placeholder",
		strings.Repeat("a", 256): "256 bytes"} {
		if _, err := CompilePattern(pattern); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("CompilePattern(%.20q): %v, want %q", pattern, err, want)
		}
	}
}

// Excitations as headers and file names give them, and what is none.
func TestExcitationWords(t *testing.T) {
	for line, want := range map[string]float64{
		"excitation: 240": 240, "Excitation\t350.0 nm": 350, "EX WL:    352.5nm": 352.5, "ex=240": 240, "# excitation_nm: 240": 240,
		"Excitation wavelength (nm);240,5": 240.5, "Anregungswellenlänge: 300 nm": 300, "λex = 275 nm": 275, "Excitation: 240 nm, emission 250-450 nm": 240,
		"lambda_ex 310": 310, "Excitation\t40000 cm-1": 250, "S1 ex240": 240, "Em (nm),Ex 240": 240, "Excitation = 240,000": 240,
		"Excitation slit: 5 nm": 0, "Excitation: 240-450 nm": 0, "Ex 240,245,250": 0, "Excitation bandwidth 500": 0, "exposure 300 ms": 0,
		"Experiment 350": 0, "complex 350": 0, "Emission: 350": 0, "Excitation: 5": 0, "Excitation start 240": 0, "excitation 240 to 300": 0,
	} {
		got, ok := mentionedEx(line)
		if ok != (want != 0) || ok && got != want {
			t.Errorf("%q: %v %v, want %v", line, got, ok, want)
		}
		if ok && !mayMention([]byte(line)) {
			t.Errorf("%q is passed over", line)
		}
	}
	for name, want := range map[string]float64{
		"scans/S1_ex240.txt": 240, "S1-EX352.5.csv": 352.5, "Bach 240nm.txt": 240, "ex240_em300nm.txt": 240, "EX_240_em_250-450.txt": 240,
		"S1_em350nm.txt": 0, "ex12.txt": 0, "S1_240.txt": 0, "index 300.txt": 0, "240nm_300nm.txt": 0, "ex240/scan.txt": 0, "S1_ex240-2.txt": 240,
	} {
		got, ok := nameEx(name)
		if ok != (want != 0) || ok && got != want {
			t.Errorf("%q: %v %v, want %v", name, got, ok, want)
		}
	}
}
