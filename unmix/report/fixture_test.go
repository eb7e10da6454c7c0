package report

import (
	"fmt"
	"math"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"tarnlight/eem"
	"tarnlight/unmix/merit"
)

// An invented survey of Gaussian components with known truth, as a folder of
// results. Bottle 3 holds a spill the model does not know, bottle 5 is saturated,
// bottle 7 was measured with the shutter closed, and the last id is hostile.
type fixture struct {
	n       int
	grid    eem.Grid
	methods []string
}

type peak struct{ ex, em, wEx, wEm, low float64 }

var fixturePeaks = []peak{
	{275, 340, 16, 24, 0.6}, {320, 400, 28, 38, 0.5}, {350, 455, 38, 48, 0.8}, {275, 306, 12, 12, 0.5},
}

var fixtureNames = []string{"Tryptophan-like", "Humic-like M", "Humic-like C", "Tyrosine-like"}

const hostileID = `</script><img src=x onerror=alert(1)>"=1+1` + "\n\u202egnp.exe"

func (p peak) excitation(nm float64) float64 {
	g := math.Exp(-(nm-p.ex)*(nm-p.ex)/(2*p.wEx*p.wEx)) + p.low*math.Exp(-(nm-230)*(nm-230)/(2*14*14))
	return min(g, 1)
}

func (p peak) emission(nm float64) float64 {
	return math.Exp(-(nm - p.em) * (nm - p.em) / (2 * p.wEm * p.wEm))
}

func spill(ex, em float64) float64 {
	return math.Exp(-(ex-260)*(ex-260)/200) * (math.Exp(-(em-365)*(em-365)/30) + 0.7*math.Exp(-(em-385)*(em-385)/30))
}

func (f fixture) id(i int) string {
	if i == f.n-1 {
		return hostileID
	}
	return fmt.Sprintf("TL-%04d", i+1)
}

func newFixture(t testing.TB, n int, methods ...string) fixture {
	return fixture{n: n, grid: eem.Grid{Ex: axis(t, 240, 465, 5), Em: axis(t, 290, 590, 2)}, methods: methods}
}

// write makes the folder.
func (f fixture) write(t testing.TB, dir string) {
	rnd := rand.New(rand.NewPCG(1, 2))
	samples := NewSamples([]string{"id", "kind", "site", "measured", "batch", "dilution", "comment"})
	contributions, flags := New("contributions.csv"), New("flags.csv")
	ids := make([]string, f.n)
	for i := range ids {
		ids[i] = f.id(i)
	}
	w, err := CreateStore(filepath.Join(dir, StoreName), StoreSettings{Grid: f.grid, Unit: eem.Raman, IDs: ids, Methods: f.methods, Title: "invented"})
	must(t, err)
	for i := range f.n {
		f.bottle(t, i, rnd, w, samples, contributions, flags)
	}
	must(t, w.Close())
	for _, x := range append(f.surveyTables(rnd), samples, contributions, flags, f.components()) {
		must(t, x.WriteFile(dir))
	}
}

func (f fixture) bottle(t testing.TB, i int, rnd *rand.Rand, w *StoreWriter, samples, contributions, flags *Table) {
	const noise = 0.004
	score := make([]float64, len(fixturePeaks))
	for c := range score {
		score[c] = math.Exp(0.6*rnd.NormFloat64()) * []float64{0.5, 0.9, 1.2, 0.25}[c]
	}
	if i%6 == 4 {
		score[3] = 0
	}
	closed := i == 7
	n := f.grid.Cells()
	x, u, res, why := make([]float64, n), make([]float32, n), make([]float64, n), make([]eem.Reason, n)
	for j := range f.grid.Ex.Len() {
		for k := range f.grid.Em.Len() {
			ex, em, at := f.grid.Ex.At(j), f.grid.Em.At(k), f.grid.Index(j, k)
			model := 0.0
			for c, p := range fixturePeaks {
				model += score[c] * p.excitation(ex) * p.emission(em)
			}
			r := noise * rnd.NormFloat64()
			if i == 3 {
				r += 0.3 * spill(ex, em)
			}
			x[at], u[at], res[at] = model+r, noise, r
			if closed {
				x[at] = noise * rnd.NormFloat64() / 4
				res[at] = x[at]
			}
			raman := 1 / (1/ex - 3400e-7)
			switch {
			case em < ex-8:
				why[at] = eem.BelowExcitation
			case math.Abs(em-ex) < 12:
				why[at] = eem.Rayleigh1
			case math.Abs(em-2*ex) < 14:
				why[at] = eem.Rayleigh2
			case math.Abs(em-raman) < 7:
				why[at] = eem.Raman1
			case i == 5 && x[at] > 1.5:
				why[at] = eem.Saturated
			}
			if why[at] != eem.Measured {
				x[at], u[at], res[at] = math.NaN(), float32(math.NaN()), math.NaN()
			}
		}
	}
	residual := map[string][]float64{}
	for _, m := range f.methods {
		residual[m] = res
	}
	must(t, w.Append(f.id(i), x, u, residual, why))
	f.rows(i, score, noise, closed, samples, contributions, flags)
}

func (f fixture) rows(i int, score []float64, noise float64, closed bool, samples, contributions, flags *Table) {
	id, nan := f.id(i), math.NaN()
	batch := fmt.Sprintf("2031-05-%02d", 3+i%3)
	doubts, rejects, explained, structure, hot := 0, 0, 99.2+0.3*math.Sin(float64(i)), 0.4, noise*3.5
	ex, em := 300.0+float64(i%9)*5, 420.0+float64(i%13)*4
	switch i {
	case 3:
		doubts, explained, structure, hot, ex, em = 1, 88.1, 41, 0.31, 260, 366
		put(flags, id, batch, "", "parafac", "unexplained", eem.Doubt, 0.881, 0.9, "88.1 % of the signal is explained; look at the residual map", "", "")
	case 5:
		doubts = 1
		put(flags, id, batch, "", "", "saturated", eem.Doubt, 212.0, 0.0, "212 cells at or above 1e6 counts were left out; dilute the bottle", "scans/TL-0006.csv", 12)
	case 7:
		rejects, explained = 1, nan
		put(flags, id, batch, "", "", "no-light", eem.Reject, nan, nan, "the scans hold nothing but zeros: was the shutter open?", "scans/TL-0008.csv", 1)
	}
	put(samples, id, map[bool]string{true: "field-blank", false: "sample"}[i%20 == 11], []string{"Weir", "Upper ford", "Mill pond", "Outfall"}[i%4],
		batch, batch, 1.0+9*float64(i%15/14), "=1+1 is text", 4300, "parafac", explained, noise*1.02, noise, structure, ex, em, hot, 6.2, 1.18,
		2.9, 0.0151, 0.0178, 0.85, 5.2, 1.4, 0.65, 0.87, 6.7, 0.7, 0.2, 0.5, 1.9, 0.9, 1.1, 0, doubts, rejects)
	if len(f.methods) > 1 { // what nothing accounts for, where two methods were asked
		put(contributions, id, "", "unexplained", hot, "RU", noise, max(0, hot-1.96*noise), hot+1.96*noise, 3*noise, map[bool]string{true: "", false: "U"}[hot > 3*noise], 1.5*noise, 10*noise, hot > 3*noise,
			map[bool]string{true: merit.Rounded(hot, 2*noise, 2), false: "< 0.012"}[hot > 3*noise], "", "")
	}
	for _, m := range f.methods {
		for c, name := range fixtureNames {
			u := 0.004 + 0.03*score[c]
			lod, q, reported, reasons := 0.013, "", merit.Rounded(score[c], 2*u, 2), ""
			switch {
			case closed:
				q, reported, reasons = "R", "not usable", "no light came through"
			case score[c] < 0.0065:
				q, reported = "U", "< 0.013"
			case i == 3:
				q, reasons = "J", "something is in the water that the model does not know"
			}
			put(contributions, id, name, m, score[c], "RU", u, max(0, score[c]-1.96*u), score[c]+1.96*u, lod, q, lod/2, 3*lod, score[c] > lod/2, reported, reasons, "4 components")
		}
	}
}

func (f fixture) components() *Table {
	x := New("components.csv")
	for _, m := range f.methods {
		for c, p := range fixturePeaks {
			for _, nm := range f.grid.Ex.Values() {
				put(x, fixtureNames[c], "excitation", nm, p.excitation(nm), 0.01+0.02*p.excitation(nm), c != 3 || nm < 330 || nm > 360, m, 4, true)
			}
			for _, nm := range f.grid.Em.Values() {
				put(x, fixtureNames[c], "emission", nm, p.emission(nm), 0.01+0.02*p.emission(nm), c != 0 || nm > 296, m, 4, true)
			}
		}
	}
	return x
}

func (f fixture) surveyTables(rnd *rand.Rand) []*Table {
	models, splits, halves := New("models.csv"), New("splits.csv"), New("split_spectra.csv")
	nan := math.NaN()
	for k := 2; k <= 6; k++ {
		verdict, reason := "pass", "passes every test; the largest number that does"
		if k < 4 {
			verdict, reason = "doubt", "structure is left in most residual maps"
		}
		if k > 4 {
			verdict, reason = "fail", "halves differ: congruence 0.71 < 0.95"
		}
		put(models, k, f.n, 4300*f.n, math.Exp(-float64(k)), 100-60*math.Exp(-1.1*float64(k)), []float64{100, 97, 91, 20, nan}[k-2],
			[]float64{.999, .998, .992, .8, .62}[k-2], []float64{.999, .999, .997, .71, .6}[k-2], 10, []int{10, 10, 8, 5, 2}[k-2], 120, true, 0.02,
			[]float64{.9, .6, .03, .03, .02}[k-2], 0.2, 0, true, verdict, k == 4, reason, 1)
	}
	for _, s := range []string{"AB–CD", "AC–BD"} {
		for c, name := range fixtureNames {
			put(splits, 4, s, name, .998-.001*float64(c), .999-.002*float64(c), .95, true)
			for _, half := range []string{"first", "second"} {
				e := 1 + 0.02*rnd.NormFloat64()
				for _, nm := range f.grid.Ex.Values() {
					put(halves, 4, s, half, name, "excitation", nm, fixturePeaks[c].excitation(nm*e))
				}
				for _, nm := range f.grid.Em.Values() {
					put(halves, 4, s, half, name, "emission", nm, fixturePeaks[c].emission(nm*e))
				}
			}
		}
	}
	batches, calibration, charts, budget, steps := New("batches.csv"), New("calibration.csv"), New("charts.csv"), New("budget.csv"), New("steps.csv")
	for d := range 3 {
		b := fmt.Sprintf("2031-05-%02d", 3+d)
		put(batches, b, "", b, f.n/3, "W1 W2", 3, 1, "RU", 512.3+float64(d), 0.012, 397.0, 250.0, 0.0011, 1, d%2, 0, map[int]string{0: "pass", 1: "doubt"}[d%2], map[int]string{1: "the field blank holds Humic-like C"}[d%2])
		put(calibration, "C"+b, b, "control", fixtureNames[0], 1.0, 1.02+0.01*float64(d), "RU", 0.02, 102.0+float64(d), 90.0, 110.0, false, "pass", "")
		for r, name := range []string{"Raman area", "Raman peak position"} {
			v, unit, sd := 512+4*rnd.NormFloat64(), "counts", 4.0
			if r == 1 {
				v, unit, sd = 397+0.3*rnd.NormFloat64(), "nm", 0.3
			}
			c := []float64{512, 397}[r]
			put(charts, name, b, "W1", b, v, unit, c, c-2*sd, c+2*sd, c-3*sd, c+3*sd, "pass", "")
		}
	}
	for c, name := range fixtureNames {
		for k, cause := range []string{"noise", "intensity scale", "loadings"} {
			put(budget, f.id(0), name, "parafac", cause, []string{"cell", "batch", "survey"}[k], 0.01/float64(k+1), "RU", 60.0/float64(k+1), 5.0, "")
		}
		_ = c
	}
	for k, s := range []string{"offset", "spectral", "inner filter", "blank", "intensity scale", "dilution", "scatter"} {
		put(steps, k+1, "", s, "", "", "", "", s+" was done as the settings say")
		put(steps, k+1, "", s, "limit", 1.5, "", "settings: default", "")
	}
	blanks := New("blanks.csv")
	for n, id := range []string{"PW1", "PW2"} {
		for _, nm := range f.grid.Ex.Values() {
			put(blanks, "2031-05-03", id, "excitation", 450.0, nm, 2+20*float64(n)*fixturePeaks[2].excitation(nm), 2.0, n == 1)
		}
		for _, nm := range f.grid.Em.Values() {
			v := any(2 + 20*float64(n)*fixturePeaks[2].emission(nm))
			if nm > 390 && nm < 410 {
				v = nan
			}
			put(blanks, "2031-05-03", id, "emission", 350.0, nm, v, 2.0, n == 1)
		}
	}
	return []*Table{models, splits, halves, batches, calibration, charts, blanks, budget, steps}
}

// put appends a row; columns that were appended to the schema later stay empty.
func put(t *Table, cells ...any) {
	for len(cells) < len(t.Columns) {
		cells = append(cells, nil)
	}
	t.Append(cells...)
}
