package scanfile

import (
	"bytes"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

// A spectrum is read as instruments write it: header and footer, any order, decimal
// comma, more columns of which one is named, JCAMP-DX, a workbook.
func TestReadCurve(t *testing.T) {
	y, u := []float64{1.5, 2.25, 3}, []float64{0.1, 0.2, 0.3}
	for name, c := range map[string]struct {
		text string
		u    []float64
	}{
		"table":      {"wavelength_nm,value,standard_uncertainty\n400,1.5,0.1\n410,2.25,0.2\n420,3,0.3\n", u},
		"short name": {"nm;E;u(E)\n400;1,5;0,1\n410;2,25;0,2\n420;3;0,3\n", u},
		"bare":       {"400 1.5\n410 2.25\n420 3\n", nil},
		"three bare": {"400 1.5 0.1\n410 2.25 0.2\n420 3 0.3\n", u},
		"export":     {"Instrument\tF-1\r\nSlit\t2.5\r\n\r\nWavelength (nm)\tIntensity (a.u.)\r\n420\t3,00\r\n410\t2,25\r\n400\t1,50\r\nEnd of scan\r\n", nil},
		"channels":   {"nm,S1 counts,R1\n400,1.5,9\n410,2.25,9\n420,3,9\n", nil},
		"wavenumber": {"wavenumber (1/cm),signal\n25000,1.5\n24390.243902439,2.25\n23809.523809524,3\n", nil},
		"jcamp":      {"##TITLE=lamp\n##JCAMP-DX=4.24\n##XUNITS=NANOMETERS\n##YUNITS=COUNTS\n##FIRSTX=400\n##LASTX=420\n##NPOINTS=3\n##XFACTOR=1\n##YFACTOR=0.25\n##XYDATA=(X++(Y..Y))\n400 6 9 12\n##END=\n", nil},
		"book.xlsx":  {string(curveBook(t)), u},
	} {
		got, notes, err := ReadCurveBytes(name, []byte(c.text), nil)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if !slices.Equal(got.Y, y) || !slices.Equal(got.U, c.u) || len(notes) == 0 {
			t.Errorf("%s: %v ± %v, notes %v", name, got.Y, got.U, notes)
		}
		for i, nm := range []float64{400, 410, 420} {
			if d := got.Axis.At(i) - nm; d > 1e-6 || d < -1e-6 {
				t.Errorf("%s: %s", name, got.Axis)
			}
		}
	}
	for text, want := range map[string]string{
		"nm,a,b\n400,1,2\n410,1,2\n":             "c.txt:1: 2 columns beside the wavelength (a, b)",
		"nm,counts,counts 2\n400,1,2\n410,1,2\n": "c.txt:1: 2 columns beside the wavelength",
		"400 1 2 3\n410 1 2 3\n":                 "c.txt:1: 3 columns beside the wavelength",
		"nm,value,u\n400,1,0.1\n410,1,-0.1\n":    "c.txt:3: a standard uncertainty of -0.1",
		"nm,value\n400,1\n410,\n420,2\n":         "c.txt:3: column 2 has no number",
		"nm,value\n400,1\n400,2\n":               "c.txt",
		"hello\n":                                "c.txt: holds no rows of numbers",
		"nm\n400\n410\n":                         "c.txt: holds no rows of numbers",
	} {
		if _, _, err := ReadCurveBytes("c.txt", []byte(text), nil); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v lacks %q", text, err, want)
		}
	}
}

// curveBook is the table of TestReadCurve as a workbook.
func curveBook(t *testing.T) []byte {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	for i, row := range [][]any{{"wavelength_nm", "value", "standard_uncertainty"}, {400, 1.5, 0.1}, {410, 2.25, 0.2}, {420, 3, 0.3}} {
		cell, _ := excelize.CoordinatesToCellName(1, i+1)
		if err := f.SetSheetRow("Sheet1", cell, &row); err != nil {
			t.Fatal(err)
		}
	}
	var b bytes.Buffer
	if err := f.Write(&b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func FuzzCurve(f *testing.F) {
	f.Add([]byte("wavelength_nm,value,standard_uncertainty\n240,1.25,0.01\n250,1.5,0.02\n"))
	f.Add([]byte("Instrument\tF-1\r\nnm\tIntensity\r\n420\t3,00\r\n410\t2,25\r\nEnd"))
	f.Add([]byte("##TITLE=lamp\n##XUNITS=NANOMETERS\n##FIRSTX=400\n##LASTX=420\n##NPOINTS=3\n##XYDATA=(X++(Y..Y))\n400 6 9 12\n##END=\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		testkit.Bounded(t, len(data), func() {
			c, notes, err := ReadCurveBytes("c.csv", data, nil)
			if err != nil {
				named(t, "c.csv", err)
				return
			}
			checkAxis(t, c.Axis, c.Y)
			if c.U != nil {
				checkAxis(t, c.Axis, c.U)
			}
			checkNotes(t, notes)
		})
	})
}
