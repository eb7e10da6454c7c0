package correct

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/stat"

	"tarnlight/eem"
)

// MercuryLines are the lines of a low-pressure mercury lamp, nm in air, that
// stand alone at the bandpass of a fluorometer: NIST Atomic Spectra Database. Left
// out are 312.567/313.155/313.184 and 576.960/579.066, which merge, and weak
// lines.
var MercuryLines = []float64{253.652, 296.728, 302.150, 334.148, 404.656, 435.833, 546.074}

// ArgonLines are strong lines of argon, as in pen lamps of mercury and argon, that
// stand alone, nm in air: NIST Atomic Spectra Database.
var ArgonLines = []float64{696.543, 706.722, 738.398, 763.511, 772.376, 826.452, 842.465, 912.297}

// LampLine is one line as a scan of a lamp shows it.
type LampLine struct {
	NM    float64 // tabulated
	Found float64 // middle of the half-height points, nm
	Width float64 // full width at half height, nm: the bandpass, where the other slit is wide
}

// FindLines looks for lines in a scan of a line lamp, within window nm on both
// sides of each. The background is the lowest cell of the window on either side
// of the line. Lines that are not covered, that rise less than a hundredth of
// the scan's maximum above the background, or whose half height is not reached
// within the window, have no entry.
func FindLines(scan Curve, lines []float64, window float64) []LampLine {
	top := 0.0
	for _, v := range scan.Y {
		top = max(top, v)
	}
	var out []LampLine
	for _, nm := range lines {
		if !scan.Axis.Covers(nm-window) || !scan.Axis.Covers(nm+window) {
			continue
		}
		if l, ok := findLine(scan, nm, window, top); ok {
			out = append(out, l)
		}
	}
	return out
}

func findLine(scan Curve, nm, window, top float64) (LampLine, bool) {
	lo, hi := -1, 0 // the window's cells are lo … hi−1
	for i := range scan.Y {
		if math.Abs(scan.Axis.At(i)-nm) > window {
			continue
		}
		if math.IsNaN(scan.Y[i]) { // clipped: no position
			return LampLine{}, false
		}
		if lo < 0 {
			lo = i
		}
		hi = i + 1
	}
	if lo < 0 {
		return LampLine{}, false
	}
	y := scan.Y[lo:hi]
	peak := 0
	for i, v := range y {
		if v > y[peak] {
			peak = i
		}
	}
	base := max(slices.Min(y[:peak+1]), slices.Min(y[peak:]))
	half := (base + y[peak]) / 2
	cross := func(step int) (float64, bool) {
		for i := peak + step; i >= 0 && i < len(y); i += step {
			if y[i] <= half {
				at, before := scan.Axis.At(lo+i), scan.Axis.At(lo+i-step)
				return before + (y[i-step]-half)/(y[i-step]-y[i])*(at-before), true
			}
		}
		return 0, false
	}
	a, ok1 := cross(-1)
	b, ok2 := cross(+1)
	return LampLine{NM: nm, Found: (a + b) / 2, Width: b - a}, ok1 && ok2 && y[peak]-base > top/100
}

// LampCheck sums up the lines of a scan.
type LampCheck struct {
	Bias float64 // mean of found minus tabulated, nm
	U    float64 // standard uncertainty of Bias, nm; NaN for one line
	// A and B of found − tabulated = A + B·(tabulated − 500 nm), and the
	// standard deviation around it; NaN for fewer than three lines, which alone can
	// tell a bent scale from a shifted one.
	A, B, Residual float64
	Width          float64 // mean full width at half height, nm
	N              int
}

// CheckLamp sums up the lines and makes the note for whoever asked: a finding
// (lamp-lines) when the bias, or the line through the differences anywhere between
// the lines, is beyond limit nm (0 means the test's default). Data are never
// shifted.
func CheckLamp(ls []LampLine, limit float64) (LampCheck, eem.Note, error) {
	if len(ls) == 0 {
		return LampCheck{}, eem.Note{}, fmt.Errorf("no line of the lamp was found in the scan")
	}
	limit = defaultLimit("lamp-lines", limit)
	c := LampCheck{N: len(ls), U: math.NaN(), A: math.NaN(), B: math.NaN(), Residual: math.NaN()}
	x, d := make([]float64, c.N), make([]float64, c.N)
	for i, l := range ls {
		x[i], d[i] = l.NM-500, l.Found-l.NM
		c.Bias += d[i] / float64(c.N)
		c.Width += l.Width / float64(c.N)
	}
	worst := math.Abs(c.Bias)
	if c.N > 1 {
		c.U = stat.StdDev(d, nil) / math.Sqrt(float64(c.N))
	}
	if c.N > 2 {
		c.A, c.B = stat.LinearRegression(x, d, nil, false)
		ss := 0.0
		for i := range x {
			ss += math.Pow(d[i]-c.A-c.B*x[i], 2)
			worst = max(worst, math.Abs(c.A+c.B*x[i]))
		}
		c.Residual = math.Sqrt(ss / float64(c.N-2))
	}
	msg := fmt.Sprintf("%d lamp lines lie %+.2f nm off on average (worst %.2f nm), %.1f nm wide", c.N, c.Bias, worst, c.Width)
	if worst <= limit {
		return c, record(StepDetector, msg), nil
	}
	return c, finding(StepDetector, "lamp-lines", worst, limit, msg+"; have the monochromator adjusted before trusting peak positions and indices with narrow windows"), nil
}
