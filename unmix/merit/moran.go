package merit

import "math"

// Moran tells whether neighbours of a map are alike: Moran's I with rook weights
// (cells that share an edge), its expectation −1/(n−1), and the standard score
// under normality and under randomisation (Cliff & Ord 1981; from memory).
type Moran struct {
	N       int     // cells present
	I       float64 // about 1 alike, about −1 opposite
	E       float64
	Z       float64 // under normality
	ZRandom float64 // under randomisation
}

// MoranI computes Moran's I of a map of rows × cols, row-major, NaN missing;
// pairs with a missing cell carry no weight. All numbers are NaN when fewer than
// four cells are present, or all are equal.
func MoranI(m []float64, rows, cols int) Moran {
	if len(m) != rows*cols {
		panic("merit: map has the wrong length")
	}
	r := untested(0)
	mean := 0.0
	for _, v := range m {
		if v == v {
			r.N++
			mean += v
		}
	}
	if r.N < 4 {
		return r
	}
	n := float64(r.N)
	mean /= n
	var s0, s2, cross, q2, q4 float64
	for i := range rows {
		for j := range cols {
			z := m[i*cols+j] - mean
			if z != z {
				continue
			}
			q2, q4 = q2+z*z, q4+z*z*z*z
			neighbours := 0.0
			for _, o := range [4][2]int{{i - 1, j}, {i + 1, j}, {i, j - 1}, {i, j + 1}} {
				if o[0] < 0 || o[0] >= rows || o[1] < 0 || o[1] >= cols {
					continue
				}
				if w := m[o[0]*cols+o[1]] - mean; w == w {
					neighbours++
					cross += z * w
				}
			}
			s0 += neighbours
			s2 += 4 * neighbours * neighbours // (w_i. + w_.i)²
		}
	}
	s1 := 2 * s0 // ½ Σ (w_ij + w_ji)², every pair counted from both sides
	if q2 == 0 || s0 == 0 {
		return r
	}
	r.I = n / s0 * cross / q2
	r.E = -1 / (n - 1)
	varN := (n*n*s1-n*s2+3*s0*s0)/((n*n-1)*s0*s0) - r.E*r.E
	k := n * q4 / (q2 * q2)
	varR := (n*((n*n-3*n+3)*s1-n*s2+3*s0*s0)-k*((n*n-n)*s1-2*n*s2+6*s0*s0))/((n-1)*(n-2)*(n-3)*s0*s0) - r.E*r.E
	r.Z = (r.I - r.E) / math.Sqrt(varN)
	r.ZRandom = (r.I - r.E) / math.Sqrt(varR)
	return r
}
