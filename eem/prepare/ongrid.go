package prepare

import "tarnlight/eem"

// bridge is the widest gap between two excitations, nm, across which scans are
// interpolated: excitation bands are 20 nm wide and more (common practice, no source).
// A bottle measured at a few excitations alone has no numbers between them.
const bridge = 20

// onGrid brings a bottle to the survey's grid, without bridging wide gaps of its
// excitations.
func (s *Survey) onGrid(e *eem.EEM) *eem.EEM {
	if e.Grid.Equal(s.Grid) {
		return e
	}
	out := e.Regrid(s.Grid)
	for j := range s.Grid.Ex.Len() {
		i, w, ok := e.Ex.Bracket(s.Grid.Ex.At(j))
		if !ok || w == 0 || e.Ex.At(i+1)-e.Ex.At(i) <= bridge {
			continue
		}
		for k := range s.Grid.Em.Len() {
			out.Drop(s.Grid.Index(j, k), eem.NotMeasured)
		}
	}
	return out
}
