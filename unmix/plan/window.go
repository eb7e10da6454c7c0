package plan

import "math"

// Timing is how long scans take.
type Timing struct {
	NMPerMinute   float64 // of the emission monochromator; 0: Dwell counts instead
	SettleSeconds float64 // a scan: moving the excitation, going back, shutter
	DwellSeconds  float64 // a point, where the instrument stops at each
}

// Minutes is the time of n scans over the points that w leaves of the emission axis
// of the design.
func (t Timing) Minutes(d *Design, w Window, n int) float64 {
	from, to, stride := d.Ends(w)
	em := d.Grid().Em
	seconds := t.SettleSeconds
	if t.NMPerMinute > 0 {
		seconds += 60 * (em.At(to-1) - em.At(from)) / t.NMPerMinute
	}
	seconds += t.DwellSeconds * math.Ceil(float64(to-from)/float64(stride))
	return float64(n) * seconds / 60
}

// Ends gives the points that w leaves: from, from + stride, … below to.
func (d *Design) Ends(w Window) (from, to, stride int) {
	if w.To == 0 {
		return 0, d.Grid().Em.Len(), 1
	}
	return w.From, w.To, max(1, w.Stride)
}

// Narrow returns the window that takes least time among those found with which the
// scans at lines cost at most 1 + loss times what they cost with the design's own,
// and what they give there. The range is cut from both ends, a twentieth at a time,
// and, where points take time, every second, third … one is left out; of the steps
// that save time the one that costs least a minute is taken until none is left.
func (d *Design) Narrow(lines []int, loss float64, t Timing) (Window, Prediction) {
	now := d.p.Window
	best := d.Predict(lines)
	limit := best.Cost * (1 + loss)
	for {
		var next Window
		var found Prediction
		price := math.Inf(1)
		for _, w := range d.smaller(now, t) {
			p := d.through(w, lines).Predict(lines)
			saved := t.Minutes(d, now, 1) - t.Minutes(d, w, 1)
			if p.Cost <= limit && saved > 0 && (p.Cost-best.Cost)/saved < price {
				next, found, price = w, p, (p.Cost-best.Cost)/saved
			}
		}
		if math.IsInf(price, 1) {
			return now, best
		}
		now, best = next, found
	}
}

// smaller lists the windows one step smaller than w.
func (d *Design) smaller(w Window, t Timing) []Window {
	from, to, stride := d.Ends(w)
	piece := max(1, d.Grid().Em.Len()/20)
	var out []Window
	if to-from > piece+d.n*stride {
		out = append(out, Window{from + piece, to, stride}, Window{from, to - piece, stride})
	}
	if t.DwellSeconds > 0 && stride < 8 && (to-from)/(stride+1) > d.n {
		out = append(out, Window{from, to, stride + 1})
	}
	return out
}
