package scanfile

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
)

func jcampFile(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join("..", "..", "testdata", "scanfile", "jcamp", name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// One spectrum in every code of the standard reads to the numbers that its
// writer meant, and to those that another general reader finds in the same files
// (jcampconverter 12.5.3; see the folder's README).
func TestJCAMPFiles(t *testing.T) {
	var truth struct {
		Em []float64 `json:"em_nm"`
		F  []float64
	}
	if err := json.Unmarshal(jcampFile(t, "truth.json"), &truth); err != nil {
		t.Fatal(err)
	}
	var other map[string][]struct{ X, Y []float64 }
	if err := json.Unmarshal(jcampFile(t, "jcampconverter.json"), &other); err != nil {
		t.Fatal(err)
	}
	if len(other) != 7 {
		t.Fatalf("%d files read by the other reader", len(other))
	}
	for name, spectra := range other {
		f, err := ReadBytes(name, jcampFile(t, name), nil)
		if err != nil {
			t.Error(err)
			continue
		}
		if f.Form != JCAMP || len(f.Scans) != len(spectra) {
			t.Errorf("%s: %s with %d scans", name, f.Form, len(f.Scans))
			continue
		}
		for i, s := range f.Scans {
			if s.Ex != 240+10*float64(i) || !slices.Equal(s.Em.Values(), truth.Em) || !slices.Equal(s.F, truth.F) {
				t.Errorf("%s: scan %d at %g nm: %v", name, i, s.Ex, s.F)
			}
			if !slices.Equal(s.Em.Values(), spectra[i].X) || !slices.Equal(s.F, spectra[i].Y) {
				t.Errorf("%s: scan %d differs from jcampconverter: %v and %v", name, i, s.F, spectra[i].Y)
			}
		}
	}
}

// CHK-9c of METHODS 9.7 (digit table of the standard), and the example that
// McDonald & Wilks 1988 give of one row of ordinates in five codes (from memory).
func TestOrdinates(t *testing.T) {
	example := []float64{1, 2, 3, 3, 2, 1, 0, -1, -2, -3}
	for text, want := range map[string][]float64{
		"A0J%K": {10, 11, 11, 13}, "A0JT%jX": {10, 11, 12, 12, 11, 10, 9, 8, 7, 6}, "b5k3S": {-25, -48},
		"1 2 3 3 2 1 0 -1 -2 -3": example, "1+2+3+3+2+1+0-1-2-3": example, "1BCCBA@abc": example, "1JJ%jjjjjj": example, "1JT%jX": example,
		"1.5E+03 2": {1500, 2}, "1E5": {1, 55}, "5U": {5, 5, 5}, "@ ? B": {0, math.NaN(), 2}, "5S2": {5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5},
	} {
		a := ordinates{limit: 20}
		_, msg := a.line([]byte("0 " + text))
		if msg != "" || !slices.EqualFunc(a.y, want, func(x, y float64) bool { return x == y || x != x && y != y }) {
			t.Errorf("%s: %v %s, want %v", text, a.y, msg, want)
		}
	}
}

// jcampText makes a small file; change replaces text in it.
func jcampText(change ...string) string {
	return strings.NewReplacer(change...).Replace(`##TITLE= S1
##JCAMP-DX= 4.24
##DATA TYPE= FLUORESCENCE SPECTRUM
##$EXCITATION= 240
##XUNITS= NANOMETERS
##YUNITS= COUNTS
##FIRSTX= 300
##LASTX= 305
##NPOINTS= 6
##XYDATA= (X++(Y..Y))
300A0JK
302A3JJ
304A5J
305A6
##END=
`)
}

func TestJCAMPRefusals(t *testing.T) {
	if _, err := ReadBytes("s.dx", []byte(jcampText()), nil); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		change []string
		want   string
	}{
		{[]string{"302A3", "302A4"}, "s.dx:12: the check value"},
		{[]string{"302A3", "320A3"}, "s.dx:12: the line begins at 320"},
		{[]string{"304A5J\n305A6\n", ""}, "s.dx:10: 5 points where NPOINTS is 6"},
		{[]string{"305A6", "305A6JJ"}, "s.dx:14: more points than NPOINTS"},
		{[]string{"305A6", "305A6S9999999999"}, "s.dx:14: a count of repeats"},
		{[]string{"300A0", "300J0"}, "s.dx:11: a difference without"},
		{[]string{"304A5J", "304A5!"}, `s.dx:13: "!" is no ordinate`},
		{[]string{"304A5J", "A5J"}, "s.dx:13: the line does not begin with an abscissa"},
		{[]string{"##NPOINTS= 6", "##NPOINTS= 1000000000"}, "s.dx:1: NPOINTS is"},
		{[]string{"##LASTX= 305\n", ""}, "s.dx:9: the record ##LASTX= is missing"},
		{[]string{"##NPOINTS", "##DELTAX= 2\n##NPOINTS"}, "s.dx:1: DELTAX is 2"},
		{[]string{"##FIRSTX= 300", "##FIRSTX= abc"}, "s.dx:1: ##FIRSTX=abc is not a number"},
		{[]string{"##END=\n", ""}, "s.dx:1: the block that begins here has no ##END="},
		{[]string{"##$EXCITATION= 240\n", ""}, "s.dx:1: no excitation"},
		{[]string{"COUNTS", "ABSORBANCE"}, "s.dx:1: YUNITS is ABSORBANCE"},
		{[]string{"NANOMETERS", "SECONDS"}, "s.dx:1: XUNITS is SECONDS"},
		{[]string{"(X++(Y..Y))", "(X++(R..R))"}, "s.dx:10: a data table of the form"},
		{[]string{"XYDATA= (X++(Y..Y))", "NTUPLES= x"}, "s.dx:10: a data table of the form"},
		{[]string{"##XYDATA= (X++(Y..Y))", "##XYDATA= (XY..XY)"}, "is not a number"},
		{[]string{"##TITLE= S1\n", "##TITLE= S1\n##END=\n##X= 1\n"}, "s.dx:3: the record ##X stands outside"},
	} {
		_, err := ReadBytes("s.dx", []byte(jcampText(c.change...)), nil)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: %v lacks %q", c.change, err, c.want)
		}
	}
	if _, err := ReadBytes("s.dx", []byte("300,1\n301,2\n"), &Settings{Form: JCAMP}); err == nil || !strings.Contains(err.Error(), "scans.form") {
		t.Errorf("%v", err)
	}
}

// Wavenumbers, micrometres, factors, and an absorbance.
func TestJCAMPUnits(t *testing.T) {
	want, err := eem.Steps(300, 305, 1)
	if err != nil {
		t.Fatal(err)
	}
	f, err := ReadBytes("s.dx", []byte(jcampText("NANOMETERS", "MICROMETERS", "= 300", "= 0.300", "= 305", "= 0.305", "\n30", "\n0.30")), nil)
	if err != nil || !f.Scans[0].Em.Equal(want) {
		t.Errorf("%v, %v", f, err)
	}
	f, err = ReadBytes("s.dx", []byte(jcampText("NANOMETERS", "1/CM", "= 300", "= 30000", "= 305", "= 30500", "300A", "30000A", "302A", "30200A", "304A", "30400A", "305A", "30500A")), nil)
	if err != nil || math.Abs(f.Scans[0].Em.Last()-1e3/3) > 1e-9 || math.Abs(f.Scans[0].Em.First()-1e7/30500) > 1e-9 || f.Scans[0].F[0] != 16 {
		t.Errorf("%v, %v", f, err)
	}
	a, notes, err := ReadAbsorbanceBytes("a.dx", []byte(jcampText("COUNTS", "ABSORBANCE", "##NPOINTS", "##YFACTOR= 0.01\n##NPOINTS")), nil)
	if err != nil || a.A[0] != 0.1 || a.Axis.Len() != 6 || len(notes) != 1 {
		t.Errorf("%v %v %v", a, notes, err)
	}
	if _, _, err := ReadAbsorbanceBytes("a.dx", []byte(jcampText()), nil); err == nil || !strings.Contains(err.Error(), "not ABSORBANCE") {
		t.Errorf("%v", err)
	}
	if g := Look("s.dx", []byte(jcampText()), nil); g.Content != ScanContent || g.Form != JCAMP || g.Excitations != 1 {
		t.Errorf("%+v", g)
	}
	if g := Look("s.dx", []byte(jcampText("COUNTS", "ABSORBANCE", "##NPOINTS", "##YFACTOR= 0.01\n##NPOINTS")), nil); g.Content != AbsorbContent || g.Err != nil {
		t.Errorf("%+v", g)
	}
}
