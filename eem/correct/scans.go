package correct

import (
	"fmt"
	"math"
	"slices"

	"tarnlight/eem"
)

// DeadScans makes scans that hold one number only missing (NotMeasured), when a
// neighbouring scan has light in the same cells, and flags them (scan-dropped).
// Only cells 10 nm and more above the excitation count, and only raw counts:
// below the Rayleigh line, and where a program clipped, equal numbers are lawful.
func DeadScans(e *eem.EEM) *eem.EEM {
	out := e.Clone()
	if e.Unit != eem.Counts {
		return out
	}
	var lost []float64
	for j := range e.Ex.Len() {
		lo := e.Ex.At(j) + ridgeNM
		if cells, flat := oneNumber(e, j, lo); !flat || cells < 5 { // fewer may be equal by rounding
			continue
		}
		for _, nb := range []int{j - 1, j + 1} {
			if nb < 0 || nb >= e.Ex.Len() {
				continue
			}
			if cells, flat := oneNumber(e, nb, max(lo, e.Ex.At(nb)+ridgeNM)); flat || cells == 0 {
				continue
			}
			for k := range e.Em.Len() {
				if i := e.Index(j, k); measured(e, i) {
					out.Drop(i, eem.NotMeasured)
				}
			}
			lost = append(lost, e.Ex.At(j))
			break
		}
	}
	if len(lost) > 0 {
		out.Note(finding(StepDetector, "scan-dropped", float64(len(lost)), 0, fmt.Sprintf(
			"the scans at ex %s nm hold one number only and were left out; scan them again", nms(lost))))
	}
	return out
}

// oneNumber counts the measured cells of scan j from lo nm on and says whether
// they are all alike.
func oneNumber(e *eem.EEM, j int, lo float64) (cells int, flat bool) {
	first := math.NaN()
	flat = true
	for k, v := range e.Row(j) {
		if e.Em.At(k) < lo || !measured(e, e.Index(j, k)) {
			continue
		}
		if cells++; cells == 1 {
			first = v
		}
		flat = flat && v == first
	}
	return cells, flat
}

// RepeatedScans flags pairs of excitations whose scans hold the same numbers in
// five or more cells that are not all alike (scan-repeated): one file under two
// names. Which one is right nobody can tell, so that nothing is masked.
func RepeatedScans(e *eem.EEM) *eem.EEM {
	out := e.Clone()
	var again []float64
	for j := range e.Ex.Len() {
		for i := range j {
			if sameScan(e, i, j) {
				again = append(again, e.Ex.At(i), e.Ex.At(j))
				break
			}
		}
	}
	if len(again) > 0 {
		out.Note(finding(StepDetector, "scan-repeated", float64(len(again)/2), 0, fmt.Sprintf(
			"%s with the numbers of another excitation (ex %s nm); look for a file under two names", eem.Count(len(again)/2, "scan"), nms(again))))
	}
	return out
}

func sameScan(e *eem.EEM, i, j int) bool {
	a, b := e.Row(i), e.Row(j)
	n, varied := 0, false
	first := math.NaN()
	for k := range a {
		if !measured(e, e.Index(i, k)) || !measured(e, e.Index(j, k)) {
			continue
		}
		if a[k] != b[k] {
			return false
		}
		if n == 0 {
			first = a[k]
		}
		varied = varied || a[k] != first
		n++
	}
	return n >= 5 && varied
}

// Swapped flags an EEM whose light lies where the emission is 20 nm and more
// shorter than the excitation, ten times what lies on the other side
// (axes-swapped): nothing but stray light can be there. Ask it before
// the other tests of scans, which know where lines and light should be.
func Swapped(e *eem.EEM) *eem.EEM {
	out := e.Clone()
	const margin, fewest = 20, 20 // nm, cells
	var v []float64
	for i := range e.F {
		if measured(e, i) {
			v = append(v, e.F[i])
		}
	}
	if len(v) == 0 {
		return out
	}
	slices.Sort(v)
	dark := v[len(v)/10] // most cells on the right side hold light
	var sum, cells [2]float64
	for j := range e.Ex.Len() {
		for k, f := range e.Row(j) {
			d := e.Em.At(k) - e.Ex.At(j)
			if math.Abs(d) < margin || !measured(e, e.Index(j, k)) {
				continue
			}
			side := 0
			if d > 0 {
				side = 1
			}
			sum[side], cells[side] = sum[side]+f-dark, cells[side]+1
		}
	}
	below, above := sum[0]/cells[0], sum[1]/cells[1]
	if cells[0] >= fewest && cells[1] >= fewest && below > 10*math.Abs(above) && below > scanNoise(e) {
		n := finding(StepDetector, "axes-swapped", below, above, fmt.Sprintf(
			"cells with emission shorter than excitation hold %s counts on average, the others %s; excitation and emission are swapped in the file: say which is which in scans", num(below), num(above)))
		out.Note(n)
	}
	return out
}

// Negative flags an EEM, blank subtracted, when more than limit percent of its
// cells lie more than three standard deviations below zero (negative): the blank
// is contaminated, or of another day. Standard deviations are those of the
// cells' variances; where there are none, of the noise between scans or along the
// scan, whichever is larger. limit 0 means the default of the test.
func Negative(e *eem.EEM, limit float64) *eem.EEM {
	out := e.Clone()
	limit = defaultLimit("negative", limit)
	between := scanNoise(e)
	n, low := 0, 0
	worst, ex, em := 0.0, 0.0, 0.0
	for j := range e.Ex.Len() {
		noise := max(between, alongNoise(e, j)) // spectral factors make some scans noisier
		for k, v := range e.Row(j) {
			i := e.Index(j, k)
			if !measured(e, i) {
				continue
			}
			n++
			sd := noise
			if e.Var != nil && e.Var[i] > 0 {
				sd = math.Sqrt(e.Var[i])
			}
			if z := -v / sd; sd > 0 && z > 3 {
				low++
				if z > worst {
					worst, ex, em = z, e.Ex.At(j), e.Em.At(k)
				}
			}
		}
	}
	if share := 100 * float64(low) / float64(max(1, n)); share > limit {
		out.Note(finding(StepBlank, "negative", share, limit, fmt.Sprintf(
			"%.1f %% of the cells are more than three standard deviations below zero after the blank, the lowest at %s; look for a contaminated blank or one of another day", share, eem.Spot(ex, em))))
	}
	return out
}

// alongNoise is the standard deviation of the noise of scan j, from the median
// absolute second difference along emission, as in scanNoise; 0 where too few
// neighbours were measured.
func alongNoise(e *eem.EEM, j int) float64 {
	row := e.Row(j)
	var d []float64
	for k := 1; k+1 < len(row); k++ {
		if i := e.Index(j, k); measured(e, i-1) && measured(e, i) && measured(e, i+1) {
			d = append(d, math.Abs(row[k-1]-2*row[k]+row[k+1]))
		}
	}
	if len(d) < 5 {
		return 0
	}
	return median(d) / normalMAD / sixth
}

// nms lists wavelengths, the first few of many.
func nms(v []float64) string {
	s := ""
	for i, nm := range v {
		if i == 8 {
			return s + ", …"
		}
		if i > 0 {
			s += ", "
		}
		s += fmt.Sprintf("%g", nm)
	}
	return s
}
