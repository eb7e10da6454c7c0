package correct_test

import (
	"math"
	"testing"

	"tarnlight/eem/correct"
)

// lampScan draws the lines of mercury, all of the table of METHODS 2.4 that a
// fluorometer sees (NIST Atomic Spectra Database), through a triangular slit, on a
// scale that shows shift(nm).
func lampScan(t *testing.T, bandpass, step float64, shift func(nm float64) float64) correct.Curve {
	heights := map[float64]float64{253.652: 900, 265.204: 20, 280.346: 9, 289.360: 12, 296.728: 60, 302.150: 30, 312.567: 80, 313.155: 90,
		334.148: 15, 365.015: 300, 365.484: 50, 366.289: 30, 404.656: 150, 407.783: 12, 435.833: 400, 546.074: 250, 576.960: 60, 579.066: 60}
	return curve(t, "lamp", 240, 600, step, func(at float64) float64 {
		v := 2.0
		for nm, h := range heights {
			v += h * max(0, 1-math.Abs(at-shift(nm))/bandpass)
		}
		return v
	}, 0)
}

// TestLampLines: a right scale, one shifted by 1.5 nm and one stretched are told
// apart; width is the slit's.
func TestLampLines(t *testing.T) {
	for name, c := range map[string]struct {
		shift   func(nm float64) float64
		a, b    float64
		flagged bool
	}{
		"right":     {func(nm float64) float64 { return nm }, 0, 0, false},
		"shifted":   {func(nm float64) float64 { return nm + 1.5 }, 1.5, 0, true},
		"stretched": {func(nm float64) float64 { return nm + 0.006*(nm-500) }, 0, 0.006, true},
	} {
		ls := correct.FindLines(lampScan(t, 2, 0.5, c.shift), correct.MercuryLines, 4)
		if len(ls) < len(correct.MercuryLines)-1 { // 296.7 shifted stands in the window of 302.2
			t.Errorf("%s: %d lines found", name, len(ls))
		}
		got, note, err := correct.CheckLamp(ls, 0)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(got.A-c.a) > 0.1 || math.Abs(got.B-c.b) > 1e-3 || got.Residual > 0.15 || math.Abs(got.Width-2) > 0.2 {
			t.Errorf("%s: %+v", name, got)
		}
		if (note.Test == "lamp-lines") != c.flagged {
			t.Errorf("%s: %+v", name, note)
		}
	}
	if _, _, err := correct.CheckLamp(nil, 0); err == nil {
		t.Error("no line passed")
	}
}
