package correct

import (
	"fmt"
	"math"

	"tarnlight/eem"
)

// ShortScans flags scans that end, or begin, inside what both their neighbours in
// excitation cover, by more than limit nm and a tenth of it (scan-short): half a
// file. A last scan is held against the two before it and a first one against the
// two behind it; there only what no instrument does on purpose counts: many begin a
// scan at the excitation and end it at twice that, so that ends and starts rise from
// scan to scan and never fall. Ask it before cells are masked. limit 0 means the
// default of the test.
func ShortScans(e *eem.EEM, limit float64) *eem.EEM {
	out := e.Clone()
	limit = defaultLimit("scan-short", limit)
	n := e.Ex.Len()
	if n < 3 {
		return out
	}
	lo, hi := make([]float64, n), make([]float64, n)
	for j := range n {
		lo[j], hi[j] = reach(e, j)
	}
	var short []float64
	worst, at := 0.0, 0
	for j := range n {
		lack, beside := shortBy(e, j, lo, hi)
		if lack > max(limit, beside/10) { // NaN compares false
			short = append(short, e.Ex.At(j))
			if lack > worst {
				worst, at = lack, j
			}
		}
	}
	if len(short) > 0 {
		out.Note(finding(StepDetector, "scan-short", worst, limit, fmt.Sprintf(
			"the scans at ex %s nm are shorter than those beside them (ex %s nm: em %s to %s nm); half a file? Export or scan them again", nms(short), eem.NM(e.Ex.At(at)), eem.NM(lo[at]), eem.NM(hi[at]))))
	}
	return out
}

// shortBy is what scan j lacks of what both its neighbours cover, and the width of
// that, nm; lo and hi are the reaches of all scans.
func shortBy(e *eem.EEM, j int, lo, hi []float64) (lack, beside float64) {
	n := len(lo)
	a, b := j-1, j+1
	switch j {
	case 0:
		a, b = 1, 2
	case n - 1:
		a, b = n-3, n-2
	}
	end, start := min(hi[a], hi[b])-hi[j], lo[j]-max(lo[a], lo[b])
	switch {
	case j == n-1:
		start = 0
	case j == 0 && (hi[a] < hi[b] || end <= 2*(e.Ex.At(1)-e.Ex.At(0))): // ends may rise, to where the instrument's range ends
		end = 0
	}
	return max(end, start), min(hi[a], hi[b]) - max(lo[a], lo[b])
}

// reach is where the measured cells of scan j begin and end, NaN without any.
func reach(e *eem.EEM, j int) (lo, hi float64) {
	lo, hi = math.NaN(), math.NaN()
	for k := range e.Em.Len() {
		if measured(e, e.Index(j, k)) {
			if hi = e.Em.At(k); lo != lo {
				lo = hi
			}
		}
	}
	return lo, hi
}
