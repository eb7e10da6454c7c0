package prepare

import "tarnlight/eem"

// bridge is the widest gap between two excitations, nm, across which scans are
// interpolated: excitation bands are 20 nm wide and more (common practice, no source).
// A bottle measured at a few excitations alone has no numbers between them.
const bridge = 20

// tells says whether scans at the excitations ax tell of nm: at it, or on both sides of
// it and near enough.
func tells(ax eem.Axis, nm float64) bool {
	i, w, ok := ax.Bracket(nm)
	return ok && ax.Bridged(nm) && (w == 0 || ax.At(i+1)-ax.At(i) <= bridge)
}

// onGrid brings a bottle to the survey's grid, without bridging wide gaps of its
// excitations.
func (s *Survey) onGrid(e *eem.EEM) *eem.EEM {
	if e.Grid.Equal(s.Grid) {
		return e
	}
	out := e.Regrid(s.Grid)
	for j := range s.Grid.Ex.Len() {
		if tells(e.Ex, s.Grid.Ex.At(j)) {
			continue
		}
		for k := range s.Grid.Em.Len() {
			out.Drop(s.Grid.Index(j, k), eem.NotMeasured)
		}
	}
	return out
}
