package prepare

import (
	"strings"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// What a bottle is told of and what the cube holds follow one rule: a bottle scanned
// at lines 40 nm apart has nothing between them, one at 10 nm is interpolated.
func TestFewLinesAreNotBridged(t *testing.T) {
	axis := func(nm ...float64) eem.Axis {
		a, err := eem.NewAxis(nm)
		if err != nil {
			t.Fatal(err)
		}
		return a
	}
	em := axis(400, 410, 420)
	s := &Survey{Sheet: &survey.Sheet{Path: "runsheet.csv"}, Settings: survey.Default(), Unit: eem.Counts, Grid: eem.Grid{Ex: axis(240, 250, 260, 280, 320, 360), Em: em}}
	for _, c := range []struct {
		ex   eem.Axis
		lack int
		test string
	}{{axis(240, 280, 320, 360), 2, "grid-lost"}, {axis(240, 260, 280, 320, 360), 0, "grid-differs"}} {
		e := eem.FromCells(eem.Grid{Ex: c.ex, Em: em}, eem.Counts, make([]float64, c.ex.Len()*em.Len()))
		b := &Bottle{Row: &survey.Row{ID: "W1"}, EEM: e}
		s.compareGrid(b)
		missing := 0
		out := s.onGrid(e)
		for j := range s.Grid.Ex.Len() {
			if out.Why[s.Grid.Index(j, 0)] == eem.NotMeasured {
				missing++
			}
		}
		if missing != c.lack {
			t.Errorf("%s: %d of its excitations are missing, want %d", c.ex, missing, c.lack)
		}
		if len(b.Flags) != 1 || b.Flags[0].Test != c.test {
			t.Errorf("%s: told %+v", c.ex, b.Flags)
		} else if c.lack > 0 && !strings.Contains(b.Flags[0].Msg, "lacks 2 of 6 excitations") {
			t.Error(b.Flags[0].Msg)
		}
	}
}

// What a bottle lacks is a note up to a quarter of the grid and a doubt above, unless
// the settings say more, two others were scanned just like it, or it is a blank.
func TestLostGrid(t *testing.T) {
	em := mustSteps(t, 400, 420, 10)
	grid := func(to float64) eem.Grid { return eem.Grid{Ex: mustSteps(t, 240, to, 20), Em: em} }
	bottle := func(to float64, kind survey.Kind) *Bottle {
		return &Bottle{Row: &survey.Row{ID: "W", Kind: kind}, EEM: eem.New(grid(to), eem.Counts)}
	}
	for _, c := range []struct {
		to     float64 // of excitations from 240 to 380 nm: 8
		kind   survey.Kind
		like   int // bottles scanned like it
		limit  float64
		test   string
		excess string
	}{
		{340, survey.Sample, 1, 25, "grid-part", "lacks 2 of 8"},
		{320, survey.Sample, 1, 25, "grid-lost", "38 % of its cells"},
		{320, survey.Sample, 2, 25, "grid-lost", "limit.grid-lost = 100 under [quality]"},
		{320, survey.Sample, 3, 25, "grid-part", "lacks 3 of 8"},
		{320, survey.Standard, 1, 25, "grid-lost", "lacks 3 of 8"},
		{240, survey.Blank, 1, 25, "grid-part", "lacks 7 of 8"},
		{320, survey.Sample, 1, 40, "grid-part", "lacks 3 of 8"},
		{240, survey.Sample, 1, 100, "grid-part", "lacks 7 of 8"},
	} {
		s := &Survey{Sheet: &survey.Sheet{Path: "runsheet.csv"}, Settings: survey.Default(), Grid: grid(380)}
		s.Settings.Quality.Limit = map[string]float64{"grid-lost": c.limit}
		for range c.like {
			s.Bottles = append(s.Bottles, bottle(c.to, c.kind))
		}
		b := s.Bottles[0]
		s.compareGrid(b)
		if len(b.Flags) != 1 || b.Flags[0].Test != c.test || !strings.Contains(b.Flags[0].Msg, c.excess) {
			t.Errorf("%+v: told %+v", c, b.Flags)
		}
	}
	if d, ok := eem.FindTest("grid-lost"); !ok || d.Limit != 25 || d.Severity != eem.Doubt {
		t.Errorf("by default: %+v", d)
	}
}

func mustSteps(t *testing.T, from, to, step float64) eem.Axis {
	t.Helper()
	a, err := eem.Steps(from, to, step)
	if err != nil {
		t.Fatal(err)
	}
	return a
}
