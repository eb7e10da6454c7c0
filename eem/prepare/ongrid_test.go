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
	}{{axis(240, 280, 320, 360), 2, "grid-part"}, {axis(240, 260, 280, 320, 360), 0, "grid-differs"}} {
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
