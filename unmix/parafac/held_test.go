package parafac

import (
	"math"
	"slices"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/synth"
	"tarnlight/nnls"

	"gonum.org/v1/gonum/mat"
)

// Four of six fluorophores are known and two unknown ones are in the water:
// with the known spectra held, the contributions of the four come back within
// 3 %; fitting the four alone is off by more than 15 %.
func TestHeldSpectraSurviveUnknownInterferents(t *testing.T) {
	ex, _ := eem.Steps(240, 460, 10)
	em, _ := eem.Steps(300, 600, 6)
	c, truth := synth.Trilinear(synth.TrilinearSpec{Ex: ex, Em: em, Samples: 24, Components: 6, Noise: 0.002, Scatter: true, Seed: 11})
	known := []int{0, 1, 3, 5}
	var hold []Held
	for _, f := range known {
		hold = append(hold, Held{Name: string(rune('A' + f)), Ex: truth.Ex[f], Em: truth.Em[f]})
	}
	r := fit(t, c, 6, &Settings{Hold: hold, Starts: 3})
	n := c.Cells()
	k := mat.NewDense(n, len(known), nil)
	for x, f := range known {
		for q := range n {
			k.Set(q, x, truth.Ex[f][q/c.Em.Len()]*truth.Em[f][q%c.Em.Len()])
		}
	}
	var held, plain []float64
	for i := range c.Len() {
		x := plainNNLS(t, k, c.Sample(i))
		for q, f := range known {
			at := slices.Index(r.Held, string(rune('A'+f)))
			a := truth.Scores[i][f]
			held = append(held, math.Abs(r.Scores[i*6+at]-a)/a)
			plain = append(plain, math.Abs(x[q]-a)/a)
		}
	}
	slices.Sort(held)
	slices.Sort(plain)
	t.Logf("relative error, median and 95th percentile: held %.4f %.4f, four alone %.4f %.4f",
		held[len(held)/2], held[len(held)*95/100], plain[len(plain)/2], plain[len(plain)*95/100])
	if e := held[len(held)*95/100]; e > 0.03 {
		t.Errorf("held spectra: 95th percentile of the error %.3f, want 0.03", e)
	}
	if e := plain[len(plain)/2]; e < 0.15 {
		t.Errorf("the four alone: median error %.3f, so that the case proves nothing", e)
	}
	for q, f := range known {
		at := slices.Index(r.Held, string(rune('A'+f)))
		if Congruence(r.Ex[at], hold[q].Ex) < 1-1e-12 || Congruence(r.Em[at], hold[q].Em) < 1-1e-12 {
			t.Errorf("held spectrum %s moved", r.Held[at])
		}
	}
}

// plainNNLS fits the columns of k to the cells that are there.
func plainNNLS(t *testing.T, k *mat.Dense, x []float64) []float64 {
	_, f := k.Dims()
	var rows, b []float64
	for q, v := range x {
		if !math.IsNaN(v) {
			rows, b = append(rows, k.RawRowView(q)...), append(b, v)
		}
	}
	dst := make([]float64, f)
	if _, err := nnls.SolveTo(dst, mat.NewDense(len(b), f, rows), b, nil); err != nil {
		t.Fatal(err)
	}
	return dst
}

func TestHeldSpectraAreChecked(t *testing.T) {
	c := small(1).cube
	flat := make([]float64, c.Ex.Len())
	em := slices.Repeat([]float64{1}, c.Em.Len())
	for name, h := range map[string][]Held{
		"short":    {{Name: "a", Ex: flat[1:], Em: em}},
		"empty":    {{Name: "a", Ex: flat, Em: em}},
		"NaN":      {{Name: "a", Ex: append([]float64{math.NaN()}, flat[1:]...), Em: em}},
		"negative": {{Name: "a", Ex: append([]float64{-1}, flat[1:]...), Em: em}},
		"too many": {{Name: "a"}, {Name: "b"}, {Name: "c"}, {Name: "d"}},
	} {
		if _, err := Fit(t.Context(), c, 3, &Settings{Hold: h}); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
