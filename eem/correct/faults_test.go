package correct_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
)

// checks runs every test of raw scans; swapped axes make the others moot.
func checks(e *eem.EEM) *eem.EEM {
	if e = correct.Swapped(e); testCodes(e) != "" {
		return e
	}
	e = correct.Spikes(correct.SaturateAuto(correct.ShortScans(e, 0)), 0, nearLines)
	return correct.RepeatedScans(correct.DeadScans(e))
}

// bottle is one of many random waters, clear to brown, turbid or not.
func bottle(in *synth.Instrument, n uint64) *eem.EEM {
	rnd := rand.New(rand.NewPCG(n, 9))
	l := synth.Liquid{Color: synth.Tail{At254: 0.3 * rnd.Float64(), Slope: 0.015}, Turbidity: 3e-4 * rnd.Float64()}
	for _, s := range []string{"tryptophan", "peat extract", "algal extract", "brightener", "pyrene"} {
		if rnd.Float64() < 0.6 {
			l = l.With(synth.Dose{Of: synth.Substance(s), Amount: 3 * rnd.Float64()})
		}
	}
	return in.Scan(l, rnd)
}

// TestFaults: each fault planted in one bottle is flagged with its code and no
// other; 39 clean bottles and a blank raise nothing.
func TestFaults(t *testing.T) {
	in := synth.NewInstrument()
	in.Saturation = 0
	for n := range uint64(39) {
		if c := testCodes(checks(bottle(in, n))); c != "" {
			t.Errorf("clean bottle %d: %q", n, c)
		}
	}
	if c := testCodes(checks(scanOf(in, synth.Liquid{}, 1))); c != "" {
		t.Errorf("pure water: %q", c)
	}
	for code, spoil := range map[string]func(e *eem.EEM) *eem.EEM{
		"spike": func(e *eem.EEM) *eem.EEM {
			e.F[e.Index(30, 100)] += 3e4 // ex 390 / em 480 nm
			return e
		},
		"plateau": func(e *eem.EEM) *eem.EEM {
			top := slices.Max(e.F) / 4
			for i, v := range e.F {
				e.F[i] = min(v, top)
			}
			return e
		},
		"scan-dropped": func(e *eem.EEM) *eem.EEM {
			for i := range e.Row(20) {
				e.Row(20)[i] = 0
			}
			return e
		},
		"scan-short": func(e *eem.EEM) *eem.EEM {
			for k := e.Em.Len() * 2 / 3; k < e.Em.Len(); k++ {
				e.Drop(e.Index(20, k), eem.NotMeasured)
			}
			return e
		},
		"scan-repeated": func(e *eem.EEM) *eem.EEM {
			copy(e.Row(21), e.Row(20))
			return e
		},
		"axes-swapped": func(e *eem.EEM) *eem.EEM {
			s := eem.New(eem.Grid{Ex: e.Em, Em: e.Ex}, e.Unit)
			for j := range s.Ex.Len() {
				for k := range s.Em.Len() {
					s.F[s.Index(j, k)], s.Why[s.Index(j, k)] = e.At(k, j), eem.Measured
				}
			}
			return s
		},
	} {
		for n := range uint64(4) {
			e := bottle(in, 100+n)
			before := e.Clone()
			out := checks(spoil(e))
			if got := testCodes(out); got != code {
				t.Errorf("%s in bottle %d: flagged %q", code, n, got)
			}
			switch code {
			case "spike":
				if i := e.Index(30, 100); out.Why[i] != eem.Spike || out.Present() != before.Present()-1 {
					t.Errorf("spike: %v, %d cells lost", out.Why[i], before.Present()-out.Present())
				}
			case "scan-dropped":
				if lost := before.Present() - out.Present(); lost != e.Em.Len() {
					t.Errorf("dropped scan: %d cells lost", lost)
				}
			}
		}
	}
}

// TestShortScans: a scan that breaks off is found wherever it stands, and windows
// that instruments have on purpose are not: all alike, from the excitation on, to
// twice the excitation, one long scan among short ones.
func TestShortScans(t *testing.T) {
	windows := map[string]func(ex float64) (lo, hi float64){
		"alike":  func(float64) (float64, float64) { return 290, 600 },
		"from":   func(ex float64) (float64, float64) { return ex + 10, 600 },
		"double": func(ex float64) (float64, float64) { return ex + 10, min(2*ex-10, 600) },
	}
	at := span(240, 400, 10)
	make1 := func(window func(float64) (float64, float64), cut map[int]float64) *eem.EEM {
		e := eem.New(grid(t, at, span(250, 600, 2)), eem.Counts)
		for j, ex := range at {
			lo, hi := window(ex)
			if end, ok := cut[j]; ok {
				hi = end
			}
			for k := range e.Em.Len() {
				if nm := e.Em.At(k); nm >= lo && nm <= hi {
					e.F[e.Index(j, k)], e.Why[e.Index(j, k)] = 100, eem.Measured
				}
			}
		}
		return e
	}
	last := len(at) - 1
	for name, w := range windows {
		for cut, want := range map[int]bool{-1: false, 1: true, 8: true, last - 1: true, last: true} {
			cuts := map[int]float64{}
			if cut >= 0 {
				lo, hi := w(at[cut])
				cuts[cut] = (lo + hi) / 2
			}
			if got := testCodes(correct.ShortScans(make1(w, cuts), 0)) == "scan-short"; got != want {
				t.Errorf("%s, scan %d cut: flagged %v", name, cut, got)
			}
		}
	}
	if got := testCodes(correct.ShortScans(make1(windows["alike"], map[int]float64{0: 400}), 0)); got != "scan-short" {
		t.Errorf("the first scan cut: %q", got)
	}
	short := func(float64) (float64, float64) { return 290, 450 }
	if got := testCodes(correct.ShortScans(make1(short, map[int]float64{7: 600}), 0)); got != "" {
		t.Errorf("one long scan: %q", got)
	}
}

// TestNegative: a contaminated blank is flagged, a right one is not.
func TestNegative(t *testing.T) {
	in := synth.NewInstrument()
	in.Saturation = 0
	step := func(e *eem.EEM) *eem.EEM {
		return correct.WithNoise(e, correct.Noise{Read: in.Read, Shot: in.PerPhoton, Offset: in.Offset, Blanks: 3})
	}
	e := step(scanOf(in, synth.Liquid{}, 1))
	clean := step(scanOf(in, synth.Liquid{}, 2))
	dirty := step(scanOf(in, synth.Liquid{}.With(synth.Dose{Of: synth.Substance("brightener"), Amount: 0.2}), 3))
	if out := correct.Negative(correct.Blank(e, clean), 0); testCodes(out) != "" {
		t.Errorf("clean blank: %+v", out.Notes)
	}
	if out := correct.Negative(correct.Blank(e, dirty), 0); testCodes(out) != "negative" {
		t.Errorf("dirty blank: %+v", out.Notes)
	}
}

// TestSugarPlateau: 134 measured EEMs of sugar solutions (Bro 1999, Chemom.
// Intell. Lab. Syst. 46, 133) whose detector stops at 999.999: the README beside
// the data counts 1132 such cells. No EEM without one is taken for clipped.
func TestSugarPlateau(t *testing.T) {
	x, shape := testkit.Npy(t, testkit.Shared(t, "data", "sugar_process", "X.npy"))
	n, emN, exN := shape[0], shape[1], shape[2]
	g := grid(t, []float64{230, 240, 255, 290, 305, 325, 340}, span(275, 560, 0.5))
	found, clipped := 0, 0
	for i := range n {
		f := make([]float64, g.Cells())
		here := 0
		for j := range exN {
			for k := range emN {
				v := x[(i*emN+k)*exN+j]
				f[g.Index(j, k)] = v
				if math.Abs(v-999.999) < 1e-3 {
					here++
				}
			}
		}
		clipped += here
		out := correct.SaturateAuto(eem.FromCells(g, eem.Counts, f))
		for _, w := range out.Why {
			if w == eem.Saturated {
				found++
			}
		}
		if here == 0 && testCodes(out) != "" {
			t.Errorf("EEM %d: %q without a clipped cell", i, testCodes(out))
		}
	}
	t.Logf("%d of %d clipped cells found", found, clipped)
	if clipped != 1132 || found < 1100 {
		t.Errorf("%d clipped cells, %d found", clipped, found)
	}
}
