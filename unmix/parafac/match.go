package parafac

import "math"

// Congruence is Tucker's coefficient x·y/(‖x‖‖y‖): 1 for the same spectrum in
// any scale. Above 0.95 two loadings can be considered equal (Lorenzo-Seva & ten
// Berge 2006, Methodology 2, 57). It is 0 when one of them is zero. It panics
// when the lengths differ.
func Congruence(x, y []float64) float64 {
	if len(x) != len(y) {
		panic("parafac: congruence of spectra of different length")
	}
	n := norm(x) * norm(y)
	if n == 0 {
		return 0
	}
	return dot(x, y) / n
}

// Pair says which component of a second model goes with component A of a first.
type Pair struct {
	A, B   int     // B is −1 when the second model has none left
	Ex, Em float64 // congruence
}

// Match pairs the components of two models, F × J and F × K each on one grid, so
// that the sum of the products of both modes' congruences is largest. The pairs
// are in the order of the first model.
func Match(ex1, em1, ex2, em2 [][]float64) []Pair {
	n := max(len(ex1), len(ex2))
	cost := make([][]float64, n)
	for f := range cost {
		cost[f] = make([]float64, n)
		for g := range cost[f] {
			if f < len(ex1) && g < len(ex2) {
				cost[f][g] = -math.Abs(Congruence(ex1[f], ex2[g]) * Congruence(em1[f], em2[g]))
			}
		}
	}
	to := assign(cost)
	out := make([]Pair, len(ex1))
	for f := range out {
		out[f] = Pair{A: f, B: -1}
		if g := to[f]; g < len(ex2) {
			out[f] = Pair{A: f, B: g, Ex: Congruence(ex1[f], ex2[g]), Em: Congruence(em1[f], em2[g])}
		}
	}
	return out
}

// assign solves the square assignment problem: row r goes to column assign[r] at
// the least total cost (shortest augmenting paths; Jonker & Volgenant 1987,
// Computing 38, 325).
func assign(cost [][]float64) []int {
	n := len(cost)
	u, v := make([]float64, n+1), make([]float64, n+1)
	row, way := make([]int, n+1), make([]int, n+1)
	for r := 1; r <= n; r++ {
		row[0] = r
		c0 := 0
		least, used := make([]float64, n+1), make([]bool, n+1)
		for c := range least {
			least[c] = math.Inf(1)
		}
		for row[c0] != 0 {
			used[c0] = true
			r0, next, delta := row[c0], 0, math.Inf(1)
			for c := 1; c <= n; c++ {
				if used[c] {
					continue
				}
				if d := cost[r0-1][c-1] - u[r0] - v[c]; d < least[c] {
					least[c], way[c] = d, c0
				}
				if least[c] < delta {
					delta, next = least[c], c
				}
			}
			for c := range used {
				if used[c] {
					u[row[c]] += delta
					v[c] -= delta
				} else {
					least[c] -= delta
				}
			}
			c0 = next
		}
		for c0 != 0 {
			row[c0] = row[way[c0]]
			c0 = way[c0]
		}
	}
	to := make([]int, n)
	for c := 1; c <= n; c++ {
		to[row[c]-1] = c - 1
	}
	return to
}
