package scanfile

import (
	"bytes"
	"math"
)

// emissionDown decides which axis of a grid is the emission: by the settings, by
// the words of the header, by physics. Words that physics contradicts outright,
// and grids about which nothing speaks, are refused.
func (r *reader) emissionDown(b *block, h *gridHead) (bool, error) {
	switch r.set.Across {
	case "excitation":
		return true, nil
	case "emission":
		return false, nil
	}
	words, sure := h.words(r)
	if words != 0 && sure {
		return words > 0, nil
	}
	physics := r.physics(b, h)
	switch {
	case words == 0 && (physics > 0 || physics < 0):
		return physics > 0, nil
	case words != 0 && words*physics > -2:
		return words > 0, nil
	case words != 0:
		return false, errorf(r.name, b.first, `the words of the header say one thing about the axes, the intensities another; set scans.across = "excitation" or "emission"`)
	}
	return false, errorf(r.name, b.first, `cannot tell which axis is the excitation; set scans.across = "excitation" or "emission", or write em_nm\ex_nm above the first column`)
}

// words says what the header says: +1 emission down, −1 emission across, 0
// nothing. It is sure where both axes are named, as in em_nm\ex_nm.
func (h *gridHead) words(r *reader) (dir int, sure bool) {
	if h.exSaid {
		return 1, true
	}
	switch k, emFirst := roleOf(h.corner); k {
	case cornerRole:
		if emFirst {
			return 1, bytes.Contains(h.corner, []byte(`\`))
		}
		return -1, bytes.Contains(h.corner, []byte(`\`))
	case emRole:
		return 1, false
	case exRole:
		return -1, false
	}
	// A title over the columns: the first cell of a line above that has text.
	for i := len(h.above) - 1; i >= max(0, len(h.above)-maxHeaderRows); i-- {
		f := r.header(h.above[i])
		for c := 0; c < len(f); c++ {
			if len(f[c]) == 0 {
				continue
			}
			if k, _ := roleOf(f[c]); c > 0 && k == exRole {
				return 1, false
			} else if c > 0 && k == emRole {
				return -1, false
			}
			break
		}
	}
	return 0, false
}

// physics weighs both readings: +2 both signs say that emission runs down, −2
// that it runs across, 0 they disagree or are silent.
func (r *reader) physics(b *block, h *gridHead) int {
	down, across := r.col(b, 0, h.from), append([]float64(nil), h.across...)
	r.toNM(down, false)
	r.toNM(across, false)
	var w balance
	for i := range down {
		row := r.rowCells(b, i+h.from)[1:]
		for j := range across {
			w.add(across[j], down[i], row[j])
		}
	}
	return w.verdict()
}

// balance weighs whether b is the emission of pairs (a, b) of wavelengths: light
// is emitted at longer wavelengths than it is absorbed at, and emission is
// scanned further to the red.
type balance struct {
	maxA, maxB   float64
	above, below float64 // sums of |intensity| where b > a, where b < a
	nAbove       int
	nBelow       int
}

// besideScatter is how far, nm, a cell must lie from the Rayleigh line to count.
const besideScatter = 15

func (w *balance) add(a, b, v float64) {
	w.maxA, w.maxB = max(w.maxA, a), max(w.maxB, b)
	switch {
	case v != v:
	case b > a+besideScatter:
		w.above += math.Abs(v)
		w.nAbove++
	case b < a-besideScatter:
		w.below += math.Abs(v)
		w.nBelow++
	}
}

// verdict is the sum of two votes, 0 where they contradict each other. A mean
// three times the other is taken as a clear difference (common practice, no
// source).
func (w *balance) verdict() int {
	reach, light := 0, 0
	switch d := w.maxB - w.maxA; {
	case d > 10:
		reach = 1
	case d < -10:
		reach = -1
	}
	up, dn := w.above/max(1, float64(w.nAbove)), w.below/max(1, float64(w.nBelow))
	switch {
	case up > 3*dn:
		light = 1
	case dn > 3*up:
		light = -1
	}
	if reach*light < 0 {
		return 0
	}
	return reach + light
}
