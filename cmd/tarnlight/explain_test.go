package main

import (
	"encoding/csv"
	"fmt"
	"math"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"tarnlight/eem/testkit"
)

// columns reads a raw text file of two columns into a map, by nothing of ours.
func columns(t *testing.T, path ...string) map[float64]float64 {
	t.Helper()
	out := map[float64]float64{}
	for _, l := range strings.Split(read(t, path...), "\n") {
		f := strings.FieldsFunc(l, func(r rune) bool { return r == ',' || r == '\t' })
		if len(f) == 2 && !math.IsNaN(parse(f[0])) && !math.IsNaN(parse(f[1])) {
			out[parse(f[0])] = parse(f[1])
		}
	}
	return out
}

// The chain that explain prints for the demo's diluted bottle, computed again for
// one cell from the raw text by the formulas of the README's sources, is the
// number in survey.nc.
func TestExplainChain(t *testing.T) {
	testkit.Heavy(t)
	dir := demoFolder(t, nil)
	runNoPictures(t, dir)
	const ex, em, dilution = 250.0, 458.0, 5.0
	fex, fem := columns(t, dir, "correction/excitation.csv"), columns(t, dir, "correction/emission.csv")
	// Counts less offset, times both spectral factors.
	cell := func(id string, ex, em float64) float64 {
		return (columns(t, dir, fmt.Sprintf("scans/%s/%s_ex%g.txt", id, id, ex))[em] - 60) * fex[ex] * fem[em]
	}
	// Parker & Rees 1962: 10^((A_ex + A_em)/2), absorbance of the liquid scanned.
	a := columns(t, dir, "absorbance/W201.csv")
	v := cell("W201", ex, em) * math.Pow(10, (a[ex]+a[em])/2)
	v -= (cell("PW2A", ex, em) + cell("PW2B", ex, em)) / 2
	// Raman area of both blanks, trapezoid over 371–428 nm with interpolated ends.
	area := 0.0
	for _, id := range []string{"PW2A", "PW2B"} {
		row := func(nm float64) float64 { return cell(id, 350, nm) }
		first, last := (row(370)+row(372))/2, row(428)
		area += (first + row(372)) / 2 / 2
		for nm := 372.0; nm < 428; nm += 2 {
			right := row(nm + 2)
			if nm+2 == 428 {
				right = last
			}
			area += (row(nm) + right) / 2 * 2 / 2
		}
	}
	want := v / area * dilution

	r := call("explain", filepath.Join(dir, "out"), "W201", "--cell", "250,458", "--csv").want(t, exitDone)
	rows, err := csv.NewReader(strings.NewReader(r.out)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	found := map[string]string{}
	for _, l := range rows {
		if l[0] == "cell ex 250 / em 458 nm" {
			found[l[1]] = l[2]
		}
	}
	for _, item := range []string{"scatter", "survey.nc"} {
		if got := number(t, found[item]); math.Abs(got/want-1) > 1e-12 {
			t.Errorf("%s: %.17g, by hand %.17g", item, got, want)
		}
	}
	if got := number(t, found["read"]); got != columns(t, dir, "scans/W201/W201_ex250.txt")[em] {
		t.Errorf("read: %g", got)
	}
	if !strings.Contains(r.out, "above-standards") || !strings.Contains(r.out, "PW2A PW2B") {
		t.Errorf("flags or blanks are missing:\n%s", r.out)
	}
	// On the screen nobody reads 17 digits.
	screen := call("explain", filepath.Join(dir, "out"), "W201", "--cell", "250,458").want(t, exitDone).out
	if long := regexp.MustCompile(`\d*\.\d{11,}`).FindString(screen); long != "" {
		t.Errorf("on the screen stands %s:\n%s", long, screen)
	}
	// A raw file that changed since is named.
	p := read(t, dir, "scans/W201/W201_ex300.txt")
	put(t, dir, "scans/W201/W201_ex300.txt", p+"\n")
	if r := call("explain", filepath.Join(dir, "out"), "W201"); !strings.Contains(r.out, "W201_ex300.txt") || !strings.Contains(r.out, "run again") {
		t.Errorf("a changed file is not named:\n%s", r.out)
	}
	call("explain", filepath.Join(dir, "out"), "nobody").want(t, exitFailed)
	call("explain", filepath.Join(dir, "out"), "W201", "--cell", "1").want(t, exitMisuse)
}
