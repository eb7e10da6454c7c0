package scatter

import (
	"math"

	"tarnlight/eem"
)

// Peak is what a ridge shows at one excitation.
type Peak struct {
	ExNM   float64 // nm
	Want   float64 // where the line should be, nm
	Em     float64 // where the ridge is, nm
	Width  float64 // full width at half height, nm
	Height float64 // above the straight line between the window's ends, unit of the EEM
	Snr    float64 // height over the noise of the window's ends
}

// Ridge looks for line l at every excitation, within window nm on both sides of
// where it should be. Position is the middle of the two half-height points,
// which a broad or clipped top does not move. Excitations whose window is not
// covered, or where nothing rises above the noise, have no entry.
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
	ex := e.Ex.At(j)
	p := Peak{ExNM: ex, Want: l.Em(ex)}
	if !e.Em.Covers(p.Want-window) || !e.Em.Covers(p.Want+window) {
		return p, false
	}
	var x, y []float64
	for k, v := range e.Row(j) {
		if em := e.Em.At(k); math.Abs(em-p.Want) <= window && !math.IsNaN(v) && e.Why[e.Index(j, k)] == eem.Measured {
			x, y = append(x, em), append(y, v)
		}
	}
	if len(x) < 5 {
		return p, false
	}
	n := len(x)
	base, slope := y[0], (y[n-1]-y[0])/(x[n-1]-x[0])
	top := 0
	for i := range y {
		y[i] -= base + slope*(x[i]-x[0])
		if y[i] > y[top] {
			top = i
		}
	}
	p.Height = y[top]
	lo, ok1 := crossing(x, y, top, -1)
	hi, ok2 := crossing(x, y, top, +1)
	p.Em, p.Width = (lo+hi)/2, hi-lo
	return p, ok1 && ok2 && p.Height > 0
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
