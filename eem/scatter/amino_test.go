package scatter_test

import (
	"math"
	"strconv"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/eem/testkit"
)

// amino reads one of five measured amino-acid solutions (Bro 1997, Chemom.
// Intell. Lab. Syst. 38, 149), raw, with weak Rayleigh light.
func amino(t *testing.T, sample string) *eem.EEM {
	t.Helper()
	rec := testkit.Records(t, testkit.Shared(t, "data", "amino_acids", "eem", sample+".csv"))
	number := func(s string) float64 {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	var ex, em []float64
	for _, s := range rec[0][1:] {
		ex = append(ex, number(s))
	}
	for _, r := range rec[1:] {
		em = append(em, number(r[0]))
	}
	return fill(axis(t, ex...), axis(t, em...), func(x, m float64) float64 {
		return number(rec[1+int(m-em[0])][1+int(x-ex[0])])
	})
}

// TestMeasuredRidge: the Rayleigh light of solutions with little fluorescence
// beside it, phenylalanine's (S3) and tryptophan's (S1) at ex ≥ 290 nm, lies on
// its line to 2 nm and is as wide as a bandpass of some 7 nm makes it; the flank
// of the fluorescence moves it by the rest. What the README says of its height
// (about 24 at ex 300) holds.
func TestMeasuredRidge(t *testing.T) {
	for _, sample := range []string{"S1", "S3"} {
		e := amino(t, sample)
		var ps []scatter.Peak
		for _, p := range scatter.Ridge(e, scatter.Rayleigh1, 15) {
			if p.ExNM >= 290 {
				ps = append(ps, p)
			}
		}
		s, ok := scatter.Offset(ps)
		t.Logf("%s: %+v", sample, s)
		if !ok || math.Abs(s.NM) > 2 || s.Width < 5 || s.Width > 14 {
			t.Errorf("%s: %+v, %v", sample, s, ok)
		}
	}
}

// TestMeasuredMask: the mask of a measured EEM has the cells that the geometry
// says, |em − ex| ≤ 12 and below, and no other.
func TestMeasuredMask(t *testing.T) {
	e := amino(t, "S4")
	m := scatter.Mask(e, []scatter.Band{{Line: scatter.Rayleigh1, Below: 12, Above: 12, Reason: eem.Rayleigh1}})
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			want := e.At(j, k)
			if e.Em.At(k) <= e.Ex.At(j)+12 {
				want = math.NaN()
			}
			if got := m.At(j, k); got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
				t.Fatalf("ex %g / em %g: %g, want %g", e.Ex.At(j), e.Em.At(k), got, want)
			}
		}
	}
}
