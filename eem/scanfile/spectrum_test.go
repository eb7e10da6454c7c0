package scanfile

import (
	"math"
	"strings"
	"testing"
)

func TestReadAbsorbance(t *testing.T) {
	want := []float64{0.25, 0.1875, math.NaN(), 0.0125}
	for name, text := range map[string]string{
		"plain":      "wavelength_nm,absorbance\n240,0.25\n250,0.1875\n260,\n270,0.0125\n",
		"descending": "Instrument\tX\nnm\tAbs\n270\t0,0125\n260\tNaN\n250\t0,1875\n240\t0,25\nEnd of scan\n",
		"named":      "nm;%T;Absorbance;note\n240;56.2;0.25;1\n250;65;0.1875;1\n260;70;;1\n270;97;0.0125;1\n",
		"bare":       "240 0.25\r\n250 0.1875\r\n260 ---\r\n270 0.0125\r\n",
	} {
		a, notes, err := ReadAbsorbanceBytes(name+".csv", []byte(text), nil)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if a.Axis.Len() != 4 || a.Axis.First() != 240 || a.PathCM != 1 || len(notes) != 1 || notes[0].Test != "read-guess" {
			t.Errorf("%s: %v path %g, notes %v", name, a.Axis, a.PathCM, notes)
		}
		for i, v := range a.A {
			if v != want[i] && !(math.IsNaN(v) && math.IsNaN(want[i])) {
				t.Errorf("%s: %v, want %v", name, a.A, want)
				break
			}
		}
	}
	for text, want := range map[string][]string{
		"nm,A,B\n240,1,2\n250,1,2\n":                      {"a.csv:2: 2 columns beside the wavelength", "absorbance"},
		"nm,Abs 1,Abs 2\n240,1,2\n250,1,2\n":              {"a.csv:1: 2 columns are named"},
		"nm,%T\n240,81\n250,82\n":                         {"a.csv:1:", "no absorbance"},
		"nm,Transmittance\n240,81\n250,82\n":              {"a.csv:1:", "no absorbance"},
		"nm,absorption coefficient (1/m)\n240,8\n250,7\n": {"a.csv:1:", "coefficient"},
		"nm,mAU\n240,8\n250,7\n":                          {"a.csv:1:", "thousandth"},
		"nm,value\n240,81\n250,82\n":                      {"a.csv:2: absorbance 81"},
		"nm,abs\n240,x\n250,0.1\n260,0.2\n":               {`a.csv:2: "x" is not a number`},
		"nm,abs\n240,0.1\n":                               {"a.csv:2: only 1 wavelength"},
		"no numbers\n":                                    {"a.csv: holds no rows"},
		"nm,abs\n240,1\n250,1\nsecond\n240,1\n250,2\n":    {"a.csv:5: a second table"},
		"nm;abs\n240;1,234\n250;1,567\n":                  {"a.csv:2:", "scans.decimal"},
	} {
		_, _, err := ReadAbsorbanceBytes("a.csv", []byte(text), nil)
		for _, w := range want {
			if err == nil || !strings.Contains(err.Error(), w) {
				t.Errorf("%q: %v lacks %q", text, err, w)
			}
		}
	}
}

func TestReadFactors(t *testing.T) {
	f, _, err := ReadFactorsBytes("f.csv", []byte("wavelength_nm,factor,standard_uncertainty\n300,1.5,0.01\n290,1.25,0.02\n"), nil)
	if err != nil || f.Axis.First() != 290 || f.Factor[0] != 1.25 || f.U[1] != 0.01 {
		t.Errorf("%+v, %v", f, err)
	}
	if f, _, err = ReadFactorsBytes("f.csv", []byte("nm;factor\n290;1,25\n300;1,5\n"), nil); err != nil || f.U != nil || f.Factor[1] != 1.5 {
		t.Errorf("%+v, %v", f, err)
	}
	for text, want := range map[string]string{
		"nm,factor\n290,0\n300,1\n":          "f.csv:2: factor 0",
		"nm,factor\n290,1\n300,\n":           "f.csv:3: factor is missing",
		"nm,factor\n290,1\n300,-2\n":         "f.csv:3: factor -2",
		"nm,f,u\n290,1,\n300,1,0.1\n":        "f.csv:2: standard uncertainty is missing",
		"nm,f,u,x\n290,1,1,1\n300,1,0.1,1\n": "f.csv:2: 4 columns",
	} {
		if _, _, err := ReadFactorsBytes("f.csv", []byte(text), nil); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v lacks %q", text, err, want)
		}
	}
}

func TestLook(t *testing.T) {
	e := small(t)
	st := style{",", ".", "\n", "UTF-8"}
	one := func(form string) (string, string) {
		for name, text := range written(e, form, st) {
			return name, text
		}
		return "", ""
	}
	gridName, gridText := one("grid")
	belowName, belowText := one("below")
	var abs strings.Builder
	for nm := 700; nm >= 230; nm -= 10 {
		abs.WriteString(st.row(st.number(float64(nm)), st.number(0.3*math.Exp(-0.015*float64(nm-230)))))
	}
	for _, c := range []struct {
		name, text string
		want       Content
		form       Form
		n          int
		ok         bool
	}{
		{gridName, gridText, ScanContent, Grid, 3, true},
		{belowName, belowText, ScanContent, Stack, 3, true},
		{"S1_ex240.txt", "300\t1\n301\t2\n", ScanContent, Stack, 1, true},
		{"scan001.txt", "300\t1000\n301\t2000\n302\t1500\n", ScanContent, Stack, 0, false},
		{"S1.csv", "wavelength_nm,absorbance\n240,0.25\n250,0.2\n", AbsorbContent, "", 0, true},
		{"S1.csv", abs.String(), AbsorbContent, "", 0, true},
		{"ex_factors.csv", "wavelength_nm,factor\n240,0.25\n250,0.2\n", FactorContent, "", 0, true},
		{"runsheet.csv", "id,kind,scans\nS1,sample,scans/S1*\n", TableContent, "", 0, true},
		{"notes.txt", "We sampled the upper weir.\n", Unknown, "", 0, false},
		{"picture.png", "\x89PNG\r\n\x1a\n\x00\x00", Unknown, "", 0, false},
		{"empty.csv", "", Unknown, "", 0, false},
		{"limits.csv", "component,detection_limit\na,0.1\n", TableContent, "", 0, true},
		{"cut.csv", gridText[:strings.LastIndexByte(gridText[:len(gridText)*3/4], ',')], ScanContent, Grid, 0, false},
	} {
		g := Look(c.name, []byte(c.text), nil)
		if g.Content != c.want || g.Form != c.form || g.Excitations != c.n || (g.Err == nil) != c.ok || g.Why == "" {
			t.Errorf("%s: %+v", c.name, g)
		}
	}
	if g := Look(gridName, []byte(gridText), nil); g.Ex != [2]float64{240, 300} || g.Em != [2]float64{310, 350} {
		t.Errorf("ranges %v %v", g.Ex, g.Em)
	}
}
