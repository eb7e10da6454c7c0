package correct_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/synth"
)

// TestLadder: one fluorophore in water from clear to very brown. With the
// simulator's own window and a measured absorbance the corrected intensity is
// within 2 % of what the same liquid would give without an inner filter, in every
// bright cell up to a total absorbance of 1.5, and above that the bottle is
// flagged. The centre form for a wide window is not as good, which shows that the
// test can tell.
func TestLadder(t *testing.T) {
	in := synth.NewInstrument()
	in.Saturation, in.ExWindow, in.EmWindow = 0, [2]float64{0.2, 0.8}, [2]float64{0.3, 0.7}
	without := *in
	without.ExWindow, without.EmWindow = [2]float64{}, [2]float64{}
	photometer := synth.NewPhotometer()
	rnd := rand.New(rand.NewPCG(11, 1))
	window := correct.Geometry{Ex: in.ExWindow, Em: in.EmWindow}
	centreWorst := 0.0
	for _, a254 := range []float64{0.02, 0.05, 0.1, 0.2, 0.4, 0.7, 1, 1.5, 2, 3} {
		l := synth.Liquid{Color: synth.Tail{At254: a254, Slope: 0.014}}.With(synth.Dose{Of: synth.Substance("peat extract"), Amount: 1})
		a := photometer.Scan(l, rnd)
		raw, truth := correct.Offset(in.Scan(l, nil), in.Offset), correct.Offset(without.Scan(l, nil), in.Offset)
		out, factor := correct.InnerFilter(raw, a, window, 0)
		centre, _ := correct.InnerFilter(raw, a, correct.Geometry{}, 0)
		worst, largest := ladderStep(t, out, truth, a)
		w, _ := ladderStep(nil, centre, truth, a)
		centreWorst = max(centreWorst, w)
		flagged := testCodes(out) != ""
		t.Logf("A254 %.2f: largest total %.2f, largest factor %.2f, worst %.2f %%, centre form %.2f %%, flagged %v", a254, largest, maxOf(factor), 100*worst, 100*w, flagged)
		if flagged != (largest > 1.5) {
			t.Errorf("A254 %g: total absorbance %.3f, flagged %v (%s)", a254, largest, flagged, testCodes(out))
		}
	}
	if centreWorst < 0.02 {
		t.Errorf("the centre form of a wide window is off by %.2g only; this test proves nothing", centreWorst)
	}
}

// ladderStep compares the bright cells off the scatter lines.
func ladderStep(t *testing.T, out, truth *eem.EEM, a *eem.Absorbance) (worst, largest float64) {
	top := maxOf(truth.F)
	for j := range out.Ex.Len() {
		for k := range out.Em.Len() {
			ex, em := out.Ex.At(j), out.Em.At(k)
			total := a.PerCM(ex) + a.PerCM(em)
			if em >= ex {
				largest = max(largest, total)
			}
			if em < ex+20 || nearLines(ex, em) || truth.At(j, k) < 0.001*top || total > 1.5 {
				continue
			}
			d := math.Abs(out.At(j, k)/truth.At(j, k) - 1)
			worst = max(worst, d)
			if t != nil && d > 0.02 {
				t.Fatalf("ex %g / em %g, total absorbance %.2f: off by %.2f %%", ex, em, total, 100*d)
			}
		}
	}
	return worst, largest
}

func maxOf(v []float64) float64 {
	m := math.Inf(-1)
	for _, x := range v {
		if x > m {
			m = x
		}
	}
	return m
}
