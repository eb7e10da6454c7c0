package correct_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/correct"
)

// scene is what a fluorometer would report: dark level and noise, the Rayleigh
// line and water's Raman line of given heights, one fluorophore.
type scene struct {
	dark, noise, rayleigh, raman, glow float64
	smooth                             int // moving mean along emission, cells
}

func (s scene) scan(t testing.TB, seed uint64, ex, em []float64) *eem.EEM {
	rnd := rand.New(rand.NewPCG(seed, 1))
	g := grid(t, ex, em)
	f := make([]float64, g.Cells())
	for j, x := range ex {
		row := make([]float64, len(em)+s.smooth)
		for k := range row {
			row[k] = rnd.NormFloat64()
		}
		for k, m := range em {
			bell := func(at, width float64) float64 { d := (m - at) / width; return math.Exp(-d * d / 2) }
			v := s.dark + s.rayleigh*bell(x, 4) + s.raman*bell(1e7/(1e7/x-3400), 7)
			if m > x { // nothing fluoresces at less than the exciting wavelength
				v += s.glow * bell(440, 40) * math.Exp(-(x-340)*(x-340)/3200)
			}
			n := row[k]
			for i := 1; i <= s.smooth; i++ {
				n += row[k+i]
			}
			f[g.Index(j, k)] = v + s.noise*n/float64(1+s.smooth)
		}
	}
	return eem.FromCells(g, eem.Counts, f)
}

func span(from, to, step float64) []float64 {
	var v []float64
	for x := from; x <= to; x += step {
		v = append(v, x)
	}
	return v
}

// TestNoLight: closed shutters of several kinds are found, water is not taken for
// one, over 40 seeds each.
func TestNoLight(t *testing.T) {
	for name, c := range map[string]struct {
		s    scene
		dark bool
	}{
		"shutter closed":                   {scene{dark: 120, noise: 3}, true},
		"shutter closed, smoothed":         {scene{dark: 120, noise: 3, smooth: 6}, true},
		"offset already subtracted":        {scene{noise: 3}, true},
		"pure water":                       {scene{dark: 120, noise: 3, rayleigh: 5000, raman: 60}, false},
		"pure water, weak lamp":            {scene{dark: 120, noise: 3, rayleigh: 40, raman: 3}, false},
		"glow alone, a third of the noise": {scene{noise: 3, glow: 6}, false},
		"coloured water":                   {scene{dark: 120, noise: 3, rayleigh: 5000, raman: 60, glow: 800}, false},
	} {
		for seed := range uint64(40) {
			e := c.s.scan(t, seed, span(240, 450, 5), span(250, 600, 2))
			if got, why := correct.NoLight(e); got != c.dark || (why != "") != got {
				t.Errorf("%s, seed %d: %v %q", name, seed, got, why)
			}
		}
	}
}

// TestNoLightFewScans: one scan and a spike in the dark.
func TestNoLightFewScans(t *testing.T) {
	one := scene{dark: 10, noise: 1}.scan(t, 1, []float64{350}, span(330, 600, 1))
	one.F[100] = 1e5
	if dark, _ := correct.NoLight(one); !dark {
		t.Error("one dark scan with a spike passes as light")
	}
	if dark, why := correct.NoLight(scene{dark: 10, noise: 1, rayleigh: 30}.scan(t, 1, []float64{350}, span(330, 600, 1))); dark {
		t.Errorf("a Rayleigh line in one scan is called dark: %s", why)
	}
}

// TestNoLightCorrected: of corrected data, and of data with the scatter cut, only
// zeros or a constant count; noise around zero is clean water.
func TestNoLightCorrected(t *testing.T) {
	noise := scene{noise: 1}.scan(t, 1, span(240, 450, 5), span(250, 600, 2))
	noise.Unit = eem.Raman
	if dark, why := correct.NoLight(noise); dark {
		t.Errorf("Raman units: %s", why)
	}
	noise.Unit = eem.Counts
	for j := range noise.Ex.Len() {
		for k := range noise.Em.Len() {
			if math.Abs(noise.Em.At(k)-noise.Ex.At(j)) <= 12 {
				noise.Drop(noise.Index(j, k), eem.Rayleigh1)
			}
		}
	}
	if dark, why := correct.NoLight(noise); dark {
		t.Errorf("scatter cut: %s", why)
	}
	for v, want := range map[float64]string{0: "every cell is zero", 3: "every cell is 3"} {
		for i := range noise.F {
			if noise.Why[i] == eem.Measured {
				noise.F[i] = v
			}
		}
		if dark, why := correct.NoLight(noise); !dark || !strings.Contains(why, want) {
			t.Errorf("all %g: %v %q", v, dark, why)
		}
	}
	if dark, _ := correct.NoLight(eem.New(noise.Grid, eem.Counts)); !dark {
		t.Error("an EEM without a number passes as light")
	}
}

// TestOffsetAuto finds the dark level below the Rayleigh line to its statistical
// error, with or without fluorescence, and refuses to guess without such cells.
func TestOffsetAuto(t *testing.T) {
	e := scene{dark: 120, noise: 3, rayleigh: 5000, raman: 60, glow: 800}.scan(t, 7, span(240, 450, 5), span(250, 600, 2))
	got, ok := correct.OffsetAuto(e)
	if !ok || math.Abs(got-120) > 0.5 { // 2,000 cells: standard error 1.25·3/√2000 = 0.08
		t.Errorf("%g %v, want 120", got, ok)
	}
	if got, ok := correct.OffsetAuto(scene{dark: 120}.scan(t, 7, span(240, 270, 5), span(250, 600, 2))); ok {
		t.Errorf("%g from a grid that has no dark region", got)
	}
}
