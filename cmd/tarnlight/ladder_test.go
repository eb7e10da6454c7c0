package main

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// ladderLimit is the total absorbance up to which the correction holds (the default
// of absorbance-limit: Kothawala et al. 2013).
const ladderLimit = 1.5

// ladderSurvey is one amount of one extract in water from clear to very brown, a
// wide window, and standards of which the upper ones drive the detector into its
// limit.
func ladderSurvey() *synth.Survey {
	in := synth.NewInstrument()
	in.ExWindow, in.EmWindow, in.Saturation = [2]float64{0.2, 0.8}, [2]float64{0.3, 0.7}, 4e5
	in.Gain *= 10
	peat := synth.Substance("peat extract")
	s := &synth.Survey{Title: "Invented ladder", Seed: 7, Instrument: in, Photometer: synth.NewPhotometer(),
		Components: []*synth.Fluorophore{peat}}
	add := func(b synth.Bottle) {
		b.Measured = time.Date(2031, time.May, 6, 8, 5*len(s.Bottles), 0, 0, time.UTC)
		s.Bottles = append(s.Bottles, b)
	}
	for n := range 3 {
		add(synth.Bottle{ID: fmt.Sprintf("PW%d", n+1), Kind: "blank", NoAbsorbance: true})
	}
	for _, amount := range []float64{1, 2, 4, 8, 16} {
		dose := []synth.Dose{{Of: peat, Amount: amount}}
		add(synth.Bottle{ID: fmt.Sprintf("STD%g", amount), Kind: "standard", Known: dose, Liquid: synth.Liquid{Doses: dose}})
	}
	for _, a254 := range []float64{0.02, 0.05, 0.1, 0.2, 0.4, 0.7, 1, 1.5, 2, 3} {
		l := synth.Liquid{Color: synth.Tail{At254: a254, Slope: 0.014}}
		add(synth.Bottle{ID: fmt.Sprintf("A%g", a254), Kind: "sample", Liquid: l.With(synth.Dose{Of: peat, Amount: 3})})
	}
	return s
}

const ladderWindow = "excitation_window_cm = [0.2, 0.8]\nemission_window_cm = [0.3, 0.7]\n"

// From clear to very brown, standards that saturate included: every bright cell
// within 2 % of the truth up to a total absorbance of 1.5, the contribution within
// 2 % where the whole bottle is below that, and a flag where it is not. The clipped
// cells of the upper standards are found, whether the limit is stated or not, and
// left out; with them in, the reference is wrong, which shows that the test can
// tell.
func TestLadder(t *testing.T) {
	testkit.Heavy(t)
	for _, c := range []struct{ name, scans, test string }{
		{"limit stated", "", "saturated"},
		{"limit inferred", "saturation = 0\n", "plateau"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := ladderSurvey()
			j := ladderJob(t, s, c.scans, "")
			for i, b := range j.sv.Bottles {
				switch b.Row.Kind {
				case "standard":
					clipped(t, s, i, b, c.test)
				case "sample":
					ladderBottle(t, j, s, i, b)
				}
			}
		})
	}
	j := ladderJob(t, ladderSurvey(), "", "off = [\"saturation\"]\n")
	if d := contributionOf(t, j, "A0.02")/3 - 1; math.Abs(d) < 0.02 {
		t.Errorf("with clipped cells in the standards the clearest bottle is off by %.2f %% only: the test proves nothing", 100*d)
	}
}

// ladderJob runs the survey with the window of its instrument and a line each in
// [scans], in place of the stated saturation, and in [correct].
func ladderJob(t *testing.T, s *synth.Survey, scans, correct string) *job {
	t.Helper()
	stated := fmt.Sprintf("saturation = %g\n", s.Instrument.Saturation)
	return simulatedWith(t, s, false, func(text string) string {
		return strings.NewReplacer(stated, cmp.Or(scans, stated), "[correct]\n", "[correct]\n"+ladderWindow+correct).Replace(text)
	})
}

// clipped holds the missing cells of a standard against those that the detector
// could not report.
func clipped(t *testing.T, s *synth.Survey, i int, b *prepare.Bottle, test string) {
	t.Helper()
	raw, _ := s.Raw(i)
	n := 0
	for at, v := range raw.F {
		if v >= s.Instrument.Saturation {
			n++
			if b.EEM.Why[at] == eem.Measured {
				t.Fatalf("%s: a clipped cell counts as measured", b.Row.ID)
			}
		}
	}
	flagged := slices.ContainsFunc(b.Flags, func(f eem.Flag) bool { return f.Test == test })
	t.Logf("%s: %d of %d cells clipped", b.Row.ID, n, len(raw.F))
	if flagged != (n > 0) {
		t.Errorf("%s: %d cells are clipped, flagged %v", b.Row.ID, n, flagged)
	}
}

// ladderBottle compares one sample with what its liquid would give without inner
// filter.
func ladderBottle(t *testing.T, j *job, s *synth.Survey, i int, b *prepare.Bottle) {
	t.Helper()
	l := s.Bottles[i].Liquid
	want := s.Instrument.Ideal(l)
	top := slices.Max(want.F)
	worst, largest := 0.0, 0.0
	for jx := range want.Ex.Len() {
		for k := range want.Em.Len() {
			ex, em := want.Ex.At(jx), want.Em.At(k)
			total := l.AbsorbanceAt(ex) + l.AbsorbanceAt(em)
			if em >= ex {
				largest = max(largest, total)
			}
			at := want.Index(jx, k)
			if b.EEM.Why[at] != eem.Measured || want.F[at] < 0.1*top || total > ladderLimit {
				continue
			}
			// The detector's own noise of a single cell is no error of the correction.
			noise := 4.5 * float64(j.cube.SampleU(j.row[b])[at])
			worst = max(worst, (math.Abs(b.EEM.F[at]-want.F[at])-noise)/want.F[at])
		}
	}
	flagged := slices.ContainsFunc(b.Flags, func(f eem.Flag) bool { return f.Test == "absorbance-limit" })
	got := contributionOf(t, j, b.Row.ID)
	t.Logf("%s: largest total absorbance %.2f, worst bright cell %.2f %%, contribution %+.2f %%, flagged %v", b.Row.ID, largest, 100*worst, 100*(got/3-1), flagged)
	if worst > 0.02 {
		t.Errorf("%s: a cell below the limit is off by %.2f %%", b.Row.ID, 100*worst)
	}
	if flagged != (largest > ladderLimit) {
		t.Errorf("%s: total absorbance %.2f, flagged %v", b.Row.ID, largest, flagged)
	}
	if !flagged && math.Abs(got/3-1) > 0.02 {
		t.Errorf("%s: contribution %.4g, holds 3", b.Row.ID, got)
	}
}

func contributionOf(t *testing.T, j *job, id string) float64 {
	t.Helper()
	for _, c := range j.judge[0].Contributions {
		if c.ID == id {
			return c.Value
		}
	}
	t.Fatalf("no contribution of %s", id)
	return nan
}
