package parafac

import "fmt"

// moves keeps, for every fitted sample, how far each loading moves when the sample
// is left out (see influence), in the fit's own scale.
type moves struct {
	d      []float32 // samples × m
	m      int
	exAt   [][]int // component of the result, excitation → entry of a row of d, −1 none
	emAt   [][]int
	ex, em [][]float64 // loadings as fitted
	exTop  []int       // where each is largest
	emTop  []int
}

// keep copies what Move needs.
func (in *influence) keep(r *Result, peakB, peakC []int) {
	m := len(in.theta)
	v := &moves{d: make([]float32, len(in.d)), m: m}
	for i, x := range in.d {
		v.d[i] = float32(x)
	}
	for _, x := range r.order {
		at, load := in.column(in.b, in.j, 0, x)
		v.exAt, v.ex, v.exTop = append(v.exAt, at), append(v.ex, load), append(v.exTop, peakB[x])
		at, load = in.column(in.c, in.k, in.nb, x)
		v.emAt, v.em, v.emTop = append(v.emAt, at), append(v.em, load), append(v.emTop, peakC[x])
	}
	r.moves = v
}

func (in *influence) column(load []float64, rows, from, x int) (at []int, v []float64) {
	at, v = make([]int, rows), make([]float64, rows)
	for r := range rows {
		at[r], v[r] = in.at[from+r*in.f+x], load[r*in.f+x]
	}
	return at, v
}

// Moves returns how many samples the loadings rest on: the range of Move.
func (r *Result) Moves() int {
	if r.moves == nil || r.moves.m == 0 {
		return 0
	}
	return len(r.moves.d) / r.moves.m
}

// Move returns how far the loadings, F × J and F × K at a maximum of 1, move to
// first order when fitted sample l is left out (infinitesimal jackknife, Jaeckel
// 1972; Efron 1982). The products of moves summed over l are the covariance of the
// loadings; a loading that is held, or at zero, does not move. It panics for l
// outside 0 … Moves()−1.
func (r *Result) Move(l int) (ex, em [][]float64) {
	if l < 0 || l >= r.Moves() {
		panic(fmt.Sprintf("parafac: move %d of %d", l, r.Moves()))
	}
	v := r.moves
	d := v.d[l*v.m : (l+1)*v.m]
	move := func(at []int) func(int) float64 {
		return func(i int) float64 {
			if at[i] < 0 {
				return 0
			}
			return float64(d[at[i]])
		}
	}
	for f := range v.ex {
		ex = append(ex, atMax(move(v.exAt[f]), v.ex[f], v.exTop[f]))
		em = append(em, atMax(move(v.emAt[f]), v.em[f], v.emTop[f]))
	}
	return ex, em
}

// atMax turns moves of a loading into those of the loading over its maximum.
func atMax(move func(i int) float64, load []float64, top int) []float64 {
	out := make([]float64, len(load))
	peak := load[top]
	if peak == 0 {
		return out
	}
	dp := move(top)
	for i, v := range load {
		out[i] = move(i)/peak - v/peak*dp/peak
	}
	return out
}
