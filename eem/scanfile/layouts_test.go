package scanfile

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
)

// describe writes scans in short: sample, excitation, wavelengths and intensities.
func describe(f *File) string {
	var b strings.Builder
	for i, s := range f.Scans {
		if f.Samples != nil {
			fmt.Fprintf(&b, "%s ", f.Samples[i])
		}
		fmt.Fprintf(&b, "%g:", s.Ex)
		for k, v := range s.F {
			fmt.Fprintf(&b, " %g=%g", math.Round(s.Em.At(k)*1e6)/1e6, v)
		}
		b.WriteString("; ")
	}
	return strings.TrimSuffix(b.String(), "; ")
}

// What instruments and people write besides the plain forms.
func TestLayouts(t *testing.T) {
	for _, c := range []struct {
		what, name, text string
		form             Form
		want             string
	}{
		{"pairs of unequal length", "a.csv", "ex240,,ex250,\nnm,counts,nm,counts\n300,1,310,4\n305,2,315,5\n,,320,6\n", Stack,
			"240: 300=1 305=2; 250: 310=4 315=5 320=6"},
		{"pairs, first the shorter, trailing delimiters", "a.txt", "EX 240 nm;;EX 250 nm;;\n300;1;310;4;\n305;2;315;5;\n;;320;6;\n;;325;7;\n", Stack,
			"240: 300=1 305=2; 250: 310=4 315=5 320=6 325=7"},
		{"pairs of two samples", "a.csv", "S1 ex240,,S2 ex240,\n300,1,300,4\n305,2,305,5\n", Stack, "S1 240: 300=1 305=2; S2 240: 300=4 305=5"},
		{"samples in columns", "day_ex350.csv", "nm,S1,S2\n400,1,2\n405,3,4\n", Stack, "S1 350: 400=1 405=3; S2 350: 400=2 405=4"},
		{"excitations in the headers", "a.csv", "Wavelength (nm),Ex 240 nm,Ex 250 nm\n300,1,2\n305,3,4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"headers X240 of a statistics package", "a.csv", `"","X240","X250"` + "\n300,1,2\n305,3,4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"no corner cell", "a.txt", "240 250\n300 1 2\n305 3 4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"corner of several words", "a.txt", "emission / nm 240 250\n300 1 2\n305 3 4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"corner 0", "a.csv", "0,240,250\n300,1,2\n305,3,4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"units below the header", "a.csv", "em,240,250\nnm,a.u.,a.u.\n300,1,2\n305,3,4\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"title above the columns", "a.csv", ",Excitation (nm)\n,300,310\n300,1,2\n310,3,4\n", Grid, "300: 300=1 310=3; 310: 300=2 310=4"},
		{"one excitation", "a.csv", "em_nm\\ex_nm,350\n400,1\n405,2\n", Stack, "350: 400=1 405=2"},
		{"one excitation, transposed", "a.csv", "ex_nm\\em_nm,400,405\n350,1,2\n", Grid, "350: 400=1 405=2"},
		{"excitations out of order", "a.csv", "em_nm\\ex_nm,250,240\n300,1,2\n305,3,4\n", Grid, "250: 300=1 305=3; 240: 300=2 305=4"},
		{"emissions descending", "a.csv", "em_nm\\ex_nm,240,250\n305,3,4\n300,1,2\n", Grid, "240: 300=1 305=3; 250: 300=2 305=4"},
		{"decimal comma in quotes", "a.csv", "em_nm\\ex_nm,\"240,5\",250\n300,\"1,5\",2\n305,3,4\n", Grid, "240.5: 300=1.5 305=3; 250: 300=2 305=4"},
		{"thousands", "a_ex240.txt", "300\t1,234.5\n305\t12,345\n310\t999\n", Stack, "240: 300=1234.5 305=12345 310=999"},
		{"thousands of a decimal comma", "a_ex240.txt", "300,5;1.234,5\n305,5;12.345\n", Stack, "240: 300.5=1234.5 305.5=12345"},
		{"exponents", "a_ex240.txt", "300;1,23E+03\n305;4,5e-1\n", Stack, "240: 300=1230 305=0.45"},
		{"free text inside a scan", "a_ex240.txt", "300 1\n305 2\nlamp refreshed\n310 3\n315 4\n", Stack, "240: 300=1 305=2 310=3 315=4"},
		{"blank lines between rows", "a_ex240.txt", "300 1\r\r\n305 2\r\r\n", Stack, "240: 300=1 305=2"},
		{"editor cut the tab of a blank cell", "a_ex240.txt", "300\t1\n305\t2\n310\n315\t4\n", Stack, "240: 300=1 305=2 310=NaN 315=4"},
		{"footer", "a_ex240.txt", "300\t1\n305\t2\n\nOperator\tN.N.\nSlit\t5\n", Stack, "240: 300=1 305=2"},
		{"numbers in the header", "a.txt", "Slit\t5\nGain\t500\nExcitation\t240\nnm\tcounts\n300\t1\n305\t2\n310\t4\n", Stack, "240: 300=1 305=2 310=4"},
		{"a day of samples below each other", "day.txt", "Sample: S1\nEX: 240\n300 1\n305 2\n\nSample: S2\nEX: 240\n300 3\n305 4\n", Stack,
			"S1 240: 300=1 305=2; S2 240: 300=3 305=4"},
		{"one excitation for all", "day.txt", "Excitation: 240\nSample: S1\n300 1\n305 2\nSample: S2\n300 3\n305 4\n", Stack,
			"S1 240: 300=1 305=2; S2 240: 300=3 305=4"},
		{"grids below each other", "day.csv", "Sample,S1\nem\\ex,240,250\n300,1,2\n305,3,4\nSample,S2\nem\\ex,240,250\n300,5,6\n305,7,8\n", Grid,
			"S1 240: 300=1 305=3; S1 250: 300=2 305=4; S2 240: 300=5 305=7; S2 250: 300=6 305=8"},
		{"long with samples", "day.csv", "sample;ex_nm;em_nm;intensity;remark\nA 1;240;300;1,5;\nA 1;240;305;2;ok\nB;240;300;3;\nB;240;305;4;\n", Long,
			"A 1 240: 300=1.5 305=2; B 240: 300=3 305=4"},
		{"long with numbered samples", "day.csv", "id,ex,em,counts\n7,240,300,1\n7,240,305,2\n8,240,300,3\n8,240,305,4\n", Long,
			"7 240: 300=1 305=2; 8 240: 300=3 305=4"},
		{"long in any order", "a.csv", "ex,em,F\n240,305,2\n250,300,3\n240,300,1\n250,305,4\n", Long, "240: 300=1 305=2; 250: 300=3 305=4"},
		{"long by emission", "a.txt", "300 240 1\n300 250 2\n300 260 1\n320 240 3\n320 250 4\n320 260 5\n", Long,
			"240: 300=1 320=3; 250: 300=2 320=4; 260: 300=1 320=5"},
		{"wavenumbers by their header", "a_ex240.txt", "wavenumber (1/cm)\tcounts\n25000\t1\n20000\t2\n", Stack, "240: 400=1 500=2"},
		{"wavenumbers by their size", "a.csv", "em\\ex,40000,32000\n25000,1,3\n20000,2,4\n", Grid, "250: 400=1 500=2; 312.5: 400=3 500=4"},
		{"an intensity among others", "a_ex240.csv", "nm,counts,gain\n300,1,9\n305,2,9\n", Stack, "240: 300=1 305=2"},
		{"header as comments", "a.txt", "# excitation_nm: 240\n# em intensity\n300 1\n305 2\n", Stack, "240: 300=1 305=2"},
		{"dates above", "a_ex240.txt", "2026-05-03 12:30:05\n2026 05 03\n300 1\n305 2\n310 2\n", Stack, "240: 300=1 305=2 310=2"},
	} {
		f, err := ReadBytes(c.name, []byte(c.text), nil)
		if err != nil {
			t.Errorf("%s: %v", c.what, err)
			continue
		}
		if got := describe(f); got != c.want || f.Form != c.form {
			t.Errorf("%s: %s\n%s, want %s\n%s", c.what, f.Form, got, c.form, c.want)
		}
	}
}

func TestSettings(t *testing.T) {
	for _, c := range []struct {
		what, name, text string
		set              Settings
		want             string
	}{
		{"decimal comma stated", "a_ex240.txt", "300\t1,234\n305\t1,500\n", Settings{Decimal: ","}, "240: 300=1.234 305=1.5"},
		{"decimal point stated", "a_ex240.txt", "300\t1,234\n305\t1,500\n", Settings{Decimal: "."}, "240: 300=1234 305=1500"},
		{"across stated", "a.csv", "x,300,310\n300,1,2\n310,3,4\n", Settings{Across: "excitation"}, "300: 300=1 310=3; 310: 300=2 310=4"},
		{"the other way", "a.csv", "x,300,310\n300,1,2\n310,3,4\n", Settings{Across: "emission"}, "300: 300=1 310=2; 310: 300=3 310=4"},
		{"pattern in the name", "L240-b.txt", "300\t1\n305\t2\n", Settings{Excitation: "L{nm}-*"}, "240: 300=1 305=2"},
		{"pattern in the header", "b.txt", "lambda 1 240.5\n300\t1\n305\t2\n", Settings{Excitation: "lambda 1 {nm}"}, "240.5: 300=1 305=2"},
		{"pattern in column headers", "b.csv", "nm,L240,L250\n300,1,2\n305,2,3\n", Settings{Excitation: "L{nm}"}, "240: 300=1 305=2; 250: 300=2 305=3"},
		{"skipped lines", "a_ex240.txt", "100 200\n110 210\n300 1\n305 2\n", Settings{Skip: 2}, "240: 300=1 305=2"},
		{"delimiter stated", "a_ex240.txt", "300 1\n305 2\n", Settings{Delimiter: " ", Form: Stack}, "240: 300=1 305=2"},
	} {
		f, err := ReadBytes(c.name, []byte(c.text), &c.set)
		if err != nil {
			t.Errorf("%s: %v", c.what, err)
		} else if got := describe(f); got != c.want {
			t.Errorf("%s: %s, want %s", c.what, got, c.want)
		}
	}
}

// The words of the guess are the same for files taken alike, whatever they hold.
func TestGuessIsOneSentence(t *testing.T) {
	var msgs []string
	for i := range 3 {
		f, err := ReadBytes(fmt.Sprintf("S_ex%d.txt", 240+i), []byte(strings.Repeat("note\n", i)+fmt.Sprintf("300\t%d\n305\t2\n", i)), nil)
		if err != nil {
			t.Fatal(err)
		}
		msgs = append(msgs, f.Notes[0].Msg)
	}
	if len(slices.Compact(msgs)) != 1 || msgs[0] != "taken for a stack: one emission scan a file, excitation from the file name, tab-delimited, decimal point, UTF-8" {
		t.Errorf("%q", msgs)
	}
}
