package correct_test

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// anyEEM draws a small EEM of ordinary, absurd and missing counts.
func anyEEM(t testing.TB, rt *rapid.T, name string, g eem.Grid) *eem.EEM {
	n := g.Cells()
	f := rapid.SliceOfN(rapid.OneOf(rapid.Float64Range(-10, 1e6), rapid.Float64(), rapid.Just(math.NaN()), rapid.Just(0.0)), n, n).Draw(rt, name)
	e := eem.FromCells(g, eem.Counts, f)
	if rapid.Bool().Draw(rt, name+" has variances") {
		e.Var = make([]float64, n)
		for i, v := range e.F {
			e.Var[i] = math.Abs(v)
		}
	}
	if rapid.Bool().Draw(rt, name+" has a cause") {
		e.Causes = []eem.Cause{{Name: "c", U: 0.1}}
	}
	return e
}

// TestChainProperties: whatever counts, absorbance and factors a file may hold, no
// step panics, a cell is either a finite number or missing with a reason, shapes
// keep their lengths, every test code is on the list, and the input stays as it
// was.
func TestChainProperties(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		g := grid(t, span(300, 300+10*float64(rapid.IntRange(0, 4).Draw(rt, "ex")), 10), span(290, 290+10*float64(rapid.IntRange(0, 14).Draw(rt, "em")), 10))
		e, b := anyEEM(t, rt, "sample", g), anyEEM(t, rt, "blank", g)
		before := e.Clone()
		ax := grid(t, span(300, 420, 20), []float64{1}).Ex
		a := &eem.Absorbance{Axis: ax, PathCM: 1, A: rapid.SliceOfN(rapid.OneOf(rapid.Float64Range(-0.1, 3), rapid.Float64()), 7, 7).Draw(rt, "A")}
		fs, err := correct.NewFactors(ax.Values(), rapid.SliceOfN(rapid.Float64Range(1e-300, 1e300), 7, 7).Draw(rt, "factors"), nil, "")
		if err != nil {
			rt.Fatal(err)
		}
		geo := correct.Geometry{Form: rapid.SampledFrom([]string{"", correct.FrontFace, correct.Transmission}).Draw(rt, "form")}
		steps := []func(*eem.EEM) *eem.EEM{
			func(e *eem.EEM) *eem.EEM { return correct.Saturate(e, 5e5) }, correct.SaturateAuto, correct.DeadScans, correct.RepeatedScans, correct.Swapped, func(e *eem.EEM) *eem.EEM { return correct.ShortScans(e, 0) },
			func(e *eem.EEM) *eem.EEM { return correct.Spikes(e, 0, nil) },
			func(e *eem.EEM) *eem.EEM { o, _ := correct.OffsetAuto(e); return correct.Offset(e, o) },
			func(e *eem.EEM) *eem.EEM { return correct.Spectral(e, fs, fs) },
			func(e *eem.EEM) *eem.EEM { o, _ := correct.InnerFilter(e, a, geo, 0); return o },
			func(e *eem.EEM) *eem.EEM { return correct.AbsorbanceCauses(e, a, geo, 0.002, 0.01, "b") },
			func(e *eem.EEM) *eem.EEM { return correct.DropOverAbsorbing(e, a, geo, 0) },
			func(e *eem.EEM) *eem.EEM { return correct.LinearRange(e, a, 1, 0) },
			func(e *eem.EEM) *eem.EEM {
				m, err := correct.Mean([]*eem.EEM{b, b})
				if err != nil {
					rt.Fatal(err)
				}
				return correct.Blank(e, m)
			},
			func(e *eem.EEM) *eem.EEM { return correct.Negative(e, 0) },
			func(e *eem.EEM) *eem.EEM {
				if r, err := correct.Areas([]*eem.EEM{b}, 300, [2]float64{300, 330}, ""); err == nil {
					return correct.RamanUnits(e, r, "")
				}
				return e
			},
			func(e *eem.EEM) *eem.EEM { return correct.Dilute(e, 10) },
		}
		out := e
		for n, step := range steps {
			out = step(out)
			sound(rt, n, out)
		}
		correct.NoLight(e)
		_, _ = correct.NoiseFrom(e, 0, nil)
		_, _ = correct.FitNoise([]*eem.EEM{e, b, b}, 0)
		if !slices.EqualFunc(e.F, before.F, func(x, y float64) bool { return math.Float64bits(x) == math.Float64bits(y) }) || !slices.Equal(e.Why, before.Why) || len(e.Notes) != 0 {
			rt.Fatal("the input changed")
		}
	})
}

func sound(rt *rapid.T, n int, e *eem.EEM) {
	for i, v := range e.F {
		if math.IsInf(v, 0) || math.IsNaN(v) != (e.Why[i] != eem.Measured) {
			rt.Fatalf("step %d, cell %d: %g, %v", n, i, v, e.Why[i])
		}
	}
	for _, c := range e.Causes {
		if c.Shape != nil && len(c.Shape) != len(e.F) {
			rt.Fatalf("step %d: cause %s has %d cells of %d", n, c.Name, len(c.Shape), len(e.F))
		}
	}
	for _, note := range e.Notes {
		if note.Test != "" {
			eem.FlagFrom(note, "", "") // panics on a code that is not on the list
		}
	}
}

// TestUnitInvariance: sample and blank in other counts (another gain) give the
// same Raman units.
func TestUnitInvariance(t *testing.T) {
	g := grid(t, []float64{340, 350}, span(360, 440, 4))
	chain := func(gain float64) []float64 {
		e, b := eem.New(g, eem.Counts), eem.New(g, eem.Counts)
		for i := range e.F {
			x := float64(i)
			e.F[i], b.F[i] = gain*(50+x), gain*(10+5*math.Sin(x))
			e.Why[i], b.Why[i] = eem.Measured, eem.Measured
		}
		r, err := correct.Areas([]*eem.EEM{b}, 350, [2]float64{371, 428}, "")
		if err != nil {
			t.Fatal(err)
		}
		return correct.RamanUnits(correct.Blank(e, b), r, "").F
	}
	one, other := chain(1), chain(37.5)
	for i, v := range one {
		near(t, "cell", other[i], v, 1e-12)
	}
}
