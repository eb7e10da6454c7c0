package correct

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
)

// Plateau returns the number at which the scans are clipped, when nobody stated
// the detector's limit: their maximum, if three or more neighbouring cells of a
// scan hold it and it stands 20 standard deviations of the noise above the
// median, so that equal counts of a dark detector are not taken for it.
func Plateau(e *eem.EEM) (limit float64, ok bool) {
	var v []float64
	for i := range e.F {
		if measured(e, i) {
			v = append(v, e.F[i])
		}
	}
	if len(v) == 0 {
		return 0, false
	}
	top := slices.Max(v)
	at := func(x float64) bool { return x >= top*(1-1e-9) } // files round
	longest := 0
	for j := range e.Ex.Len() {
		run := 0
		for k, x := range e.Row(j) {
			if !measured(e, e.Index(j, k)) || !at(x) {
				run = 0
				continue
			}
			run++
			longest = max(longest, run)
		}
	}
	const fewest = 3 // two equal tops of a rounded peak are ordinary
	return top, longest >= fewest && top > medianOf(v)+20*scanNoise(e)
}

// SaturateAuto is Saturate at the plateau, flagged (plateau); without one it
// changes nothing.
func SaturateAuto(e *eem.EEM) *eem.EEM {
	limit, ok := Plateau(e)
	out := e.Clone()
	if !ok {
		return out
	}
	n := 0
	for i, v := range out.F {
		if v >= limit*(1-1e-9) {
			out.Drop(i, eem.Saturated)
			n++
		}
	}
	out.Note(record(StepSaturation, eem.Count(n, "cell")+" at the scans' flat top left out",
		eem.Param{Name: "saturation", Value: num(limit), Unit: "counts", Source: "plateau"}))
	out.Note(finding(StepSaturation, "plateau", float64(n), 0, fmt.Sprintf(
		"left out as saturated: %s at %s counts, the most that these scans hold; state scans.saturation if the detector's limit is another", eem.Count(n, "cell"), num(limit))))
	return out
}

// Spikes makes cells that stand out alone missing (Spike): more than limit
// standard deviations of the noise, and by half, above all of the two cells on
// each side in their scan and the same three of the neighbouring scans. avoid
// says where light is that narrow, as on the scatter lines; nil avoids nothing.
// limit 0 means the default of the test.
func Spikes(e *eem.EEM, limit float64, avoid func(exNM, emNM float64) bool) *eem.EEM {
	out := e.Clone()
	limit = defaultLimit("spike", limit)
	noise := scanNoise(e)
	if !(noise > 0) {
		return out
	}
	var v []float64
	for i := range e.F {
		if measured(e, i) {
			v = append(v, e.F[i])
		}
	}
	dark := medianOf(v)
	n, worst, ex, em := 0, 0.0, 0.0, 0.0
	for j := range e.Ex.Len() {
		for k := range e.Em.Len() {
			i := e.Index(j, k)
			if !measured(e, i) || e.F[i] < dark+limit*noise {
				continue
			}
			around, known := surroundings(e, j, k)
			z := (e.F[i] - around) / noise
			if !known || z <= limit || e.F[i]-around <= 0.5*math.Abs(around-dark) {
				continue
			}
			if avoid != nil && avoid(e.Ex.At(j), e.Em.At(k)) { // last: it costs more than all the rest
				continue
			}
			out.Drop(i, eem.Spike)
			n++
			if z > worst {
				worst, ex, em = z, e.Ex.At(j), e.Em.At(k)
			}
		}
	}
	if n > 0 {
		out.Note(finding(StepDetector, "spike", worst, limit, fmt.Sprintf(
			"%s left out: standing out of all neighbours; the highest, at %s, by %.0f standard deviations of the noise", eem.Count(n, "single cell"), eem.Spot(ex, em), worst)))
	}
	return out
}

// surroundings is the highest measured cell around (j, k). known is false
// without one on each side in the scan: at the end of a scan light may rise.
func surroundings(e *eem.EEM, j, k int) (top float64, known bool) {
	top = math.Inf(-1)
	left, right := false, false
	for dj := -1; dj <= 1; dj++ {
		for dk := -2; dk <= 2; dk++ {
			jj, kk := j+dj, k+dk
			if (dj == 0 && dk == 0) || (dj != 0 && (dk < -1 || dk > 1)) || jj < 0 || kk < 0 || jj >= e.Ex.Len() || kk >= e.Em.Len() {
				continue
			}
			if i := e.Index(jj, kk); measured(e, i) {
				top = max(top, e.F[i])
				left, right = left || (dj == 0 && dk < 0), right || (dj == 0 && dk > 0)
			}
		}
	}
	return top, left && right
}
