package synth

import (
	"bytes"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"tarnlight/eem"
)

// Without errors of the stock the truth must come back; with them a component's
// values are off by one common factor, which no look at the data can tell.
func TestDesignRecoversTruth(t *testing.T) {
	for _, stock := range []float64{0, 0.05} {
		s := Design{Samples: 12, Stock: stock, Stand: 0.001, Brown: 0.1, Seed: 5}.Survey()
		found := solve(t, s)
		for f, of := range s.Components {
			factor := 1.0 // nominal / true
			for _, b := range s.Bottles {
				if b.Kind == "standard" && b.Known[0].Of == of {
					factor = b.Known[0].Amount / b.Liquid.Amount(of)
				}
			}
			if (stock == 0) != (factor == 1) {
				t.Errorf("stock error %g: %s has nominal/true %g", stock, of.Name, factor)
			}
			var errs []float64
			for _, r := range s.Truth() {
				if r.Component == of.Name {
					errs = append(errs, math.Abs(found[r.ID][of.Name]/(r.Value*factor)-1))
				}
			}
			slices.Sort(errs)
			if m := errs[len(errs)/2]; m > 0.01 {
				t.Errorf("stock %g, component %d: median error %.2f %%", stock, f, 100*m)
			}
		}
	}
}

func TestDesignCounts(t *testing.T) {
	s := Design{Samples: 7, Components: 3, Days: 3, Blanks: 1, Levels: 2, Absent: 1, Unknown: 2, Seed: 1}.Survey()
	count := map[string]int{}
	unknown := 0
	for _, b := range s.Bottles {
		count[b.Kind]++
		if b.Liquid.Amount(Substance("dyestuff")) > 0 {
			unknown++
		}
	}
	if count["sample"] != 7 || count["blank"] != 3 || count["standard"] != 6 || unknown != 2 {
		t.Errorf("%v, %d with the dyestuff", count, unknown)
	}
	for _, r := range s.Truth() {
		if r.Value != 0 {
			t.Errorf("%+v should be absent", r)
		}
	}
}

func TestSpoil(t *testing.T) {
	s := Design{Samples: 1, Seed: 1}.Survey()
	last := len(s.Bottles) - 1
	clean, _ := s.Raw(last)
	s.Bottles[last].Spoil = func(e *eem.EEM, rnd *rand.Rand) { e.F[100] += 5e4 }
	spoilt, _ := s.Raw(last)
	if d := spoilt.F[100] - clean.F[100]; math.Abs(d-5e4) > 0.11 {
		t.Errorf("spike of %g counts, want 50,000", d)
	}
	spoilt.F[100] = clean.F[100]
	if !slices.Equal(spoilt.F, clean.F) {
		t.Error("spoiling one cell changed others")
	}
}

// A second instrument gets its own factor files and settings, and its bottles
// their own limit.
func TestSetups(t *testing.T) {
	s := Design{Samples: 2, Seed: 1}.Survey()
	other := NewInstrument()
	other.Saturation, other.Offset = 9e4, 25
	other.Lamp = Band{{At: 24000, Width: 7000, Height: 1}}
	s.Setups = map[string]*Instrument{"old": other}
	last := len(s.Bottles) - 1
	s.Bottles[last].Setup = "old"
	e, _ := s.Raw(last)
	if maxOf(e.F) > 9e4 {
		t.Errorf("largest count %g above the setup's limit", maxOf(e.F))
	}
	files := map[string][]byte{}
	for f := range s.Files() {
		files[f.Path] = f.Data
	}
	want := "[setup.\"old\"]\nsaturation = 90000\noffset = 25\nexcitation_factors = \"correction/old-excitation.csv\"\n"
	if !strings.Contains(string(files["survey.toml"]), want) {
		t.Errorf("settings:\n%s", files["survey.toml"])
	}
	if a, b := files["correction/old-excitation.csv"], files["correction/excitation.csv"]; len(a) == 0 || bytes.Equal(a, b) {
		t.Error("the setup's excitation factors are missing or those of the other instrument")
	}
	s.Bottles[last].Setup = "new"
	defer func() {
		if recover() == nil {
			t.Error("an unknown setup was measured")
		}
	}()
	s.Raw(last)
}

// A monochromator that shows too little puts the ridges too low by as much.
func TestWavelengthOffset(t *testing.T) {
	in := NewInstrument()
	in.Ex, in.Em = axis(t, 350), steps(330, 370, 0.1)
	for _, off := range [][2]float64{{0, 0}, {0, 1.5}, {-2, 0}} {
		in.Off = off
		e := in.Scan(Liquid{}, nil)
		if got, want := e.Em.At(peakOf(e.F)), 350+off[0]-off[1]; math.Abs(got-want) > 0.06 {
			t.Errorf("offset %v: ridge at %g nm, want %g", off, got, want)
		}
		if !e.Grid.Equal(in.Grid) {
			t.Error("the scan does not show the grid that was set")
		}
	}
}

func BenchmarkDesign20(b *testing.B) {
	for b.Loop() {
		s := Design{}.Survey()
		for i := range s.Bottles {
			s.Raw(i)
		}
	}
}
