package merit_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/scatter"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// linesOf are the bands that a test takes out.
func linesOf() []merit.Line {
	return []merit.Line{
		{Band: scatter.Band{Line: scatter.Rayleigh1, Below: 15, Above: 15}, Name: "Rayleigh line", Remedy: "widen rayleigh.first"},
		{Band: scatter.Band{Line: scatter.Raman1, Below: 10, Above: 10}, Name: "water Raman line", Remedy: "widen raman.first"},
		{Band: scatter.Band{Line: scatter.Rayleigh2, Below: 15, Above: 15}, Name: "second-order Rayleigh line", Remedy: "widen rayleigh.second"},
	}
}

// left makes a bottle of a known band and of what a function adds, the bands of
// linesOf taken out, and returns what is told of its residual.
func left(t *testing.T, more func(ex, em float64) float64) string {
	ex, _ := eem.Steps(240, 400, 5)
	em, _ := eem.Steps(250, 600, 5)
	g := eem.Grid{Ex: ex, Em: em}
	known := unmix.Component{Name: "a", AmountUnit: "mg/L", Scale: 1}
	bell := func(x, at, width float64) float64 { return math.Exp(-(x - at) * (x - at) / (2 * width * width)) }
	for j := range ex.Len() {
		known.Ex = append(known.Ex, bell(ex.At(j), 340, 30))
	}
	for k := range em.Len() {
		known.Em = append(known.Em, bell(em.At(k), 450, 40))
	}
	set := &unmix.Set{Grid: g, Unit: eem.Raman, Method: "references", Origin: "test", Components: []unmix.Component{known}}
	c := &eem.Cube{Grid: g, Unit: eem.Raman, IDs: []string{"W1"}}
	const sd = 0.01
	rnd := rand.New(rand.NewPCG(6, 7))
	for j := range ex.Len() {
		for k := range em.Len() {
			v, why := known.At(g, j, k)+more(ex.At(j), em.At(k))+sd*rnd.NormFloat64(), eem.Measured
			if em.At(k) < ex.At(j) {
				v, why = math.NaN(), eem.BelowExcitation
			}
			for _, l := range linesOf() {
				if lo, hi := l.Range(ex.At(j)); em.At(k) >= lo && em.At(k) <= hi {
					v, why = math.NaN(), l.Reason
				}
			}
			c.X, c.Why, c.U = append(c.X, v), append(c.Why, why), append(c.U, sd)
		}
	}
	r, sp := spreads(t, c, set, nil)
	limit := func(code string) float64 { f, _ := eem.FindTest(code); return f.Limit }
	j := merit.Judge(r, sp, []merit.Bottle{{ID: "W1", Lines: linesOf()}}, c.Sample, limit, func(f eem.Flag) eem.Flag { return f }, "test")
	for _, f := range j.Flags {
		if f.Test == "unexplained" || f.Test == "structure" {
			return f.Msg
		}
	}
	return ""
}

// Light along scatter lines, wider than what was taken out, is called that, with the
// setting that helps; a substance is not, be it small or large, also where lines cross
// it: bands of tyrosine, tryptophan (303 and 350 nm: Lakowicz, Principles of
// Fluorescence Spectroscopy, from memory) and of one that only the Raman line meets.
func TestScatterLeft(t *testing.T) {
	wing := func(l scatter.Line, width float64) func(ex, em float64) float64 {
		return func(ex, em float64) float64 { return math.Exp(-math.Abs(em-l.Em(ex)) / width) }
	}
	for _, size := range []float64{0.3, 3} {
		for _, on := range []struct {
			of   []scatter.Line
			want []string
		}{
			{[]scatter.Line{scatter.Rayleigh1}, []string{"along the Rayleigh line", "widen rayleigh.first"}},
			{[]scatter.Line{scatter.Raman1}, []string{"along the water Raman line", "widen raman.first"}},
			{[]scatter.Line{scatter.Rayleigh2}, []string{"along the second-order Rayleigh line", "widen rayleigh.second"}},
		} {
			msg := left(t, func(ex, em float64) (v float64) {
				for _, l := range on.of {
					v += size * 3 * wing(l, 8)(ex, em)
				}
				return v
			})
			for _, w := range on.want {
				if !strings.Contains(msg, w) || strings.Contains(msg, "is not in the model") {
					t.Errorf("%v of %g: %q, want %q", on.of, size, msg, w)
				}
			}
		}
		for _, s := range [][4]float64{{275, 12, 303, 14}, {280, 14, 350, 25}, {300, 20, 335, 15}, {260, 15, 290, 12}} {
			msg := left(t, func(ex, em float64) float64 {
				x, y := (ex-s[0])/s[1], (em-s[2])/s[3]
				return size * math.Exp(-(x*x+y*y)/2)
			})
			if msg == "" || strings.Contains(msg, "along the") {
				t.Errorf("a substance at ex %g / em %g nm, %g: %q", s[0], s[2], size, msg)
			}
		}
	}
}
