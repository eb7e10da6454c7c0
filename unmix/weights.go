package unmix

import (
	"tarnlight/eem"
)

// Weights says how the references came from their standards: the surface of
// component f in cell i is Σ_s W(i)[f][s]·F_s(i), in intensity per amount. It is
// what carries an error of a standard into the references.
type Weights struct {
	F, S    int
	solvers []*slopeSolver
	of      []int32 // cell → solver
}

// WeightsOf returns the weights by which FromStandards makes references of the
// same names and standards on grid g.
func WeightsOf(g eem.Grid, names []string, standards []Standard) *Weights {
	w := &Weights{F: len(names), S: len(standards), of: make([]int32, g.Cells())}
	on, conc := stacked(g, names, standards)
	at := map[string]int32{}
	present := make([]byte, len(standards))
	for i := range g.Cells() {
		presentAt(present, on, i)
		n, ok := at[string(present)]
		if !ok {
			n = int32(len(w.solvers))
			at[string(present)] = n
			w.solvers = append(w.solvers, newSlopeSolver(conc, present))
		}
		w.of[i] = n
	}
	return w
}

// Each calls do for every weight of cell i that is not zero by construction:
// component f, standard s.
func (w *Weights) Each(i int, do func(f, s int, weight float64)) {
	v := w.solvers[w.of[i]]
	for b, f := range v.comps {
		for a, s := range v.rows {
			do(f, s, v.pinv.At(b, a))
		}
	}
}
