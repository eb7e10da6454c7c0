package prepare

import (
	"fmt"
	"sort"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// chooseGrid takes the given grid, the stated one or that of the most samples, and
// says who lacks what.
func (s *Survey) chooseGrid(given *eem.Grid) error {
	type vote struct {
		grid  eem.Grid
		n     int
		first int
	}
	var votes []vote
	count := func(pass func(*Bottle) bool) {
		for i, b := range s.Bottles {
			if !b.Usable() || !pass(b) {
				continue
			}
			at := -1
			for v := range votes {
				if votes[v].grid.Equal(b.EEM.Grid) {
					at = v
				}
			}
			if at < 0 {
				at = len(votes)
				votes = append(votes, vote{grid: b.EEM.Grid, first: i})
			}
			votes[at].n++
		}
	}
	count(func(b *Bottle) bool { return b.Row.Kind == survey.Sample })
	if len(votes) == 0 {
		count(func(*Bottle) bool { return true })
	}
	if len(votes) == 0 && given != nil { // a model waits: that nothing can be scored on it is a result
		s.Grid = *given
		return nil
	}
	if len(votes) == 0 {
		return s.nothingLeft()
	}
	sort.SliceStable(votes, func(a, b int) bool { return votes[a].n > votes[b].n })
	s.Grid = votes[0].grid
	if given != nil {
		s.Grid = *given
	}
	for _, a := range []struct {
		want *survey.Range
		axis *eem.Axis
		key  string
	}{{s.Settings.Grid.Excitation, &s.Grid.Ex, "excitation"}, {s.Settings.Grid.Emission, &s.Grid.Em, "emission"}} {
		if a.want != nil && given == nil {
			ax, err := eem.Steps(a.want.From, a.want.To, a.want.Step)
			if err != nil {
				return fmt.Errorf("settings, grid.%s: %w", a.key, err)
			}
			*a.axis = ax
		}
	}
	for _, b := range s.Bottles {
		if b.Usable() {
			s.compareGrid(b)
		}
	}
	return nil
}

// nothingLeft tells the first reasons why no bottle can be used.
func (s *Survey) nothingLeft() error {
	msg := ""
	n := 0
	for _, b := range s.Bottles {
		for _, f := range b.Flags {
			if f.Severity == eem.Reject {
				if n++; n <= 5 {
					msg += fmt.Sprintf("\n  %s: %s", b.Row.ID, f.Msg)
				}
				break
			}
		}
	}
	if n > 5 {
		msg += fmt.Sprintf("\n  and %d more", n-5)
	}
	return fmt.Errorf("%s: not one bottle can be used:%s", s.Sheet.Path, msg)
}

// compareGrid notes what a bottle lacks of the survey's grid.
func (s *Survey) compareGrid(b *Bottle) {
	if b.EEM.Grid.Equal(s.Grid) {
		return
	}
	var lackEx, lackEm, off int
	for j := range s.Grid.Ex.Len() {
		if nm := s.Grid.Ex.At(j); !tells(b.EEM.Ex, nm) {
			lackEx++
		} else if _, ok := b.EEM.Ex.Find(nm); !ok {
			off++
		}
	}
	for k := range s.Grid.Em.Len() {
		if nm := s.Grid.Em.At(k); !b.EEM.Em.Covers(nm) || !b.EEM.Em.Bridged(nm) {
			lackEm++
		} else if _, ok := b.EEM.Em.Find(nm); !ok {
			off++
		}
	}
	nj, nk := s.Grid.Ex.Len(), s.Grid.Em.Len()
	if lack := nj*nk - (nj-lackEx)*(nk-lackEm); lack > 0 {
		s.flagLack(b, lack, fmt.Sprintf("measured on %s; lacks %d of %d excitations and %d of %d emissions of the survey's grid (%s)", b.EEM.Grid, lackEx, nj, lackEm, nk, s.Grid))
	}
	if off > 0 {
		b.flag(s, eem.Note{Test: "grid-differs", Severity: eem.Remark,
			Msg: fmt.Sprintf("measured on %s; interpolated linearly onto the survey's grid (%s)", b.EEM.Grid, s.Grid)})
	}
}

// laddered is how many bottles scanned on one grid show that it was meant.
const laddered = 3

// flagLack notes that a bottle lacks so many cells of the grid. Above the limit of
// grid-lost it is a doubt: files got lost. It is none where other bottles were scanned
// on the very same grid, as a plan of fewer scans is, nor for a blank, of which
// the Raman scan may be all: blank-range says where it does not do.
func (s *Survey) flagLack(b *Bottle, lack int, msg string) {
	share, limit := 100*float64(lack)/float64(s.Grid.Cells()), s.Limit("grid-lost")
	if share <= limit || b.Row.Kind == survey.Blank || s.onSameGrid(b) >= laddered {
		b.flag(s, eem.Note{Test: "grid-part", Severity: eem.Remark, Measure: true, Value: float64(lack), Msg: msg})
		return
	}
	b.flag(s, eem.Note{Test: "grid-lost", Severity: eem.Doubt, Measure: true, Value: share, Limit: limit, Msg: fmt.Sprintf(
		"%s: %.0f %% of its cells, and fewer than %d bottles were scanned like this; look whether all its files have come; if it was meant so, limit.grid-lost = 100 under [quality]", msg, share, laddered)})
}

// onSameGrid counts the usable bottles on the grid of b, with itself.
func (s *Survey) onSameGrid(b *Bottle) (n int) {
	for _, other := range s.Bottles {
		if other.Usable() && other.EEM.Grid.Equal(b.EEM.Grid) {
			n++
		}
	}
	return n
}
