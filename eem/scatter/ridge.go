package scatter

import (
	"math"
	"slices"

	"tarnlight/eem"
)

// Peak is what a ridge shows at one excitation.
type Peak struct {
	ExNM   float64 // nm
	Want   float64 // where the line should be, nm
	Em     float64 // where the ridge is, nm: the middle of its half-height points
	Width  float64 // full width at half height, nm
	Height float64 // above the background, unit of the EEM
	Snr    float64 // height over the standard deviation of the background around its line
}

// ridgeSnr is the least height, in standard deviations of the background, that
// counts as a ridge: one window of noise has about 20 cells, of which the
// highest reaches 2.
const ridgeSnr = 5

// Ridge looks for line l at every excitation, within window nm on both sides of
// where it should be. The background is a straight line through the outer fifths
// of the window, which should reach well past the ridge: three times its width
// is good. Position is the middle of the two half-height points,
// which a broad top does not move. An excitation has no entry where the window is
// not covered or has cells missing (a clipped ridge tells no position), where
// nothing rises well above the background, or where the middle lies nearer to the
// end of the window than to the line. Strong fluorescence beside the line can
// pass for one; blanks show ridges best, and Offset is robust.
func Ridge(e *eem.EEM, l Line, window float64) []Peak {
	var out []Peak
	for j := range e.Ex.Len() {
		if p, ok := ridgeAt(e, j, l, window); ok {
			out = append(out, p)
		}
	}
	return out
}

func ridgeAt(e *eem.EEM, j int, l Line, window float64) (Peak, bool) {
	const fewest = 7 // cells in a window: three for the ridge and two for the background on each side
	ex := e.Ex.At(j)
	p := Peak{ExNM: ex, Want: l.Em(ex)}
	x, y, ok := stretch(e, j, p.Want-window, p.Want+window)
	if !ok || len(x) < fewest {
		return p, false
	}
	noise := levelled(x, y)
	top := 0
	for i := range y {
		if y[i] > y[top] {
			top = i
		}
	}
	lo, ok1 := crossing(x, y, top, -1)
	hi, ok2 := crossing(x, y, top, +1)
	p.Em, p.Width, p.Height, p.Snr = (lo+hi)/2, hi-lo, y[top], y[top]/noise
	if noise == 0 { // made-up data without noise
		p.Snr = math.Inf(1)
	}
	return p, ok1 && ok2 && p.Height > 0 && p.Snr >= ridgeSnr && math.Abs(p.Em-p.Want) <= window/2
}

// stretch copies the cells of scan j in lo … hi nm. ok is false where the scan
// does not reach from end to end or a cell was not measured.
func stretch(e *eem.EEM, j int, lo, hi float64) (x, y []float64, ok bool) {
	if !e.Em.Covers(lo) || !e.Em.Covers(hi) {
		return nil, nil, false
	}
	row, why := e.Row(j), e.Why[j*e.Em.Len():]
	for k, v := range row {
		if em := e.Em.At(k); em >= lo && em <= hi {
			if !known(row, why, k) {
				return nil, nil, false
			}
			x, y = append(x, em), append(y, v)
		}
	}
	return x, y, true
}

// levelled subtracts from y the straight line through the means of its outer
// fifths and returns the standard deviation of those around the line.
func levelled(x, y []float64) float64 {
	n := len(x)
	m := max(2, n/5)
	mean := func(v []float64) float64 {
		s := 0.0
		for _, u := range v {
			s += u
		}
		return s / float64(len(v))
	}
	x1, y1, x2, y2 := mean(x[:m]), mean(y[:m]), mean(x[n-m:]), mean(y[n-m:])
	slope := (y2 - y1) / (x2 - x1)
	for i := range y {
		y[i] -= y1 + slope*(x[i]-x1)
	}
	ss := 0.0
	for i := range m {
		ss += y[i]*y[i] + y[n-1-i]*y[n-1-i]
	}
	return math.Sqrt(ss / float64(max(1, 2*m-2)))
}

// crossing walks from the top until y falls to half and interpolates there.
func crossing(x, y []float64, top, step int) (float64, bool) {
	half := y[top] / 2
	for i := top + step; i >= 0 && i < len(x); i += step {
		if y[i] <= half {
			w := (y[i-step] - half) / (y[i-step] - y[i])
			return x[i-step] + w*(x[i]-x[i-step]), true
		}
	}
	return 0, false
}

// Shift is how far the ridges of one line lie from where they should.
type Shift struct {
	NM     float64 // median of found minus wanted, nm
	Spread float64 // 1.4826 · median absolute deviation, nm: a standard deviation that outliers do not move
	U      float64 // standard uncertainty of NM, nm: √(π/2)·Spread/√N
	Width  float64 // median full width at half height, nm
	N      int     // excitations with a ridge
}

// Offset sums up the ridges of a line over the excitations. ok is false for
// fewer than three: a median of two is no better than a guess.
func Offset(ps []Peak) (s Shift, ok bool) {
	if len(ps) < 3 {
		return Shift{N: len(ps)}, false
	}
	d, w := make([]float64, len(ps)), make([]float64, len(ps))
	for i, p := range ps {
		d[i], w[i] = p.Em-p.Want, p.Width
	}
	s = Shift{NM: median(d), Width: median(w), N: len(ps)}
	for i := range d {
		d[i] = math.Abs(d[i] - s.NM)
	}
	s.Spread = 1.4826 * median(d)
	s.U = math.Sqrt(math.Pi/2) * s.Spread / math.Sqrt(float64(s.N))
	return s, true
}

func median(v []float64) float64 { return quantile(v, 0.5) }

// quantile interpolates between the sorted values.
func quantile(v []float64, q float64) float64 {
	s := slices.Sorted(slices.Values(v))
	at := q * float64(len(s)-1)
	i := int(at)
	if i+1 == len(s) {
		return s[i]
	}
	return s[i] + (at-float64(i))*(s[i+1]-s[i])
}
