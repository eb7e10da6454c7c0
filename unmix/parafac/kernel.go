package parafac

import "math"

// Own scalar kernels: the products of a fit are skinny (F columns), where they
// run two to three times as fast as a general matrix product.

func dot(x, y []float64) float64 {
	var s0, s1, s2, s3 float64
	y = y[:len(x)]
	i := 0
	for ; i+4 <= len(x); i += 4 {
		s0 += x[i] * y[i]
		s1 += x[i+1] * y[i+1]
		s2 += x[i+2] * y[i+2]
		s3 += x[i+3] * y[i+3]
	}
	for ; i < len(x); i++ {
		s0 += x[i] * y[i]
	}
	return (s0 + s1) + (s2 + s3)
}

func sumSquares(x []float64) float64 { return dot(x, x) }

// norm is the 2-norm, without care for overflow: the data are scaled.
func norm(x []float64) float64 { return math.Sqrt(dot(x, x)) }

func axpy(a float64, x, y []float64) {
	y = y[:len(x)]
	for i, v := range x {
		y[i] += a * v
	}
}

// block is how many cells of a row are worked on at a time, so that all the rows
// of the smaller operand stay in the cache.
const block = 512

// rowsTimesTo writes dst = X·KT', rows × f, for the rows of X and KT f × n.
func rowsTimesTo(dst []float64, x [][]float64, kt []float64, f int) {
	clear(dst[:len(x)*f])
	if len(x) == 0 {
		return
	}
	n := len(x[0])
	for lo := 0; lo < n; lo += block {
		hi := min(lo+block, n)
		for r, xr := range x {
			d, xr := dst[r*f:(r+1)*f], xr[lo:hi]
			g := 0
			for ; g+5 <= f; g += 5 {
				dot5(d[g:g+5], xr, kt[g*n+lo:], n)
			}
			for ; g+3 <= f; g += 3 {
				dot3(d[g:g+3], xr, kt[g*n+lo:], n)
			}
			for ; g < f; g++ {
				d[g] += dot(xr, kt[g*n+lo:g*n+hi])
			}
		}
	}
}

// dot5 and dot3 add the products of x with 5 or 3 rows of k, stride n.
func dot5(d, x, k []float64, n int) {
	m := len(x)
	k0, k1, k2, k3, k4 := k[:m], k[n:][:m], k[2*n:][:m], k[3*n:][:m], k[4*n:][:m]
	var s0, s1, s2, s3, s4 float64
	for i, v := range x {
		s0 += v * k0[i]
		s1 += v * k1[i]
		s2 += v * k2[i]
		s3 += v * k3[i]
		s4 += v * k4[i]
	}
	d[0], d[1], d[2], d[3], d[4] = d[0]+s0, d[1]+s1, d[2]+s2, d[3]+s3, d[4]+s4
}

func dot3(d, x, k []float64, n int) {
	m := len(x)
	k0, k1, k2 := k[:m], k[n:][:m], k[2*n:][:m]
	var s0, s1, s2 float64
	for i, v := range x {
		s0 += v * k0[i]
		s1 += v * k1[i]
		s2 += v * k2[i]
	}
	d[0], d[1], d[2] = d[0]+s0, d[1]+s1, d[2]+s2
}

// addTransposed adds A'·X to dst, f × n, for A rows × f and the rows of X, four
// rows at a time.
func addTransposed(dst, a []float64, x [][]float64, f int) {
	if len(x) == 0 {
		return
	}
	n := len(x[0])
	for lo := 0; lo < n; lo += block {
		hi := min(lo+block, n)
		r := 0
		for ; r+4 <= len(x); r += 4 {
			for g := range f {
				add4(dst[g*n+lo:g*n+hi], x[r][lo:], x[r+1][lo:], x[r+2][lo:], x[r+3][lo:],
					a[r*f+g], a[(r+1)*f+g], a[(r+2)*f+g], a[(r+3)*f+g])
			}
		}
		for ; r < len(x); r++ {
			for g := range f {
				axpy(a[r*f+g], x[r][lo:hi], dst[g*n+lo:g*n+hi])
			}
		}
	}
}

func add4(d, x0, x1, x2, x3 []float64, a0, a1, a2, a3 float64) {
	m := len(d)
	x0, x1, x2, x3 = x0[:m], x1[:m], x2[:m], x3[:m]
	for i := range d {
		d[i] += (a0*x0[i] + a1*x1[i]) + (a2*x2[i] + a3*x3[i])
	}
}

// gramTo writes the f × f Gram matrix of the columns of a, rows × f.
func gramTo(dst, a []float64, rows, f int) {
	clear(dst[:f*f])
	for r := range rows {
		v := a[r*f : (r+1)*f]
		for g, x := range v {
			if x == 0 {
				continue
			}
			for h := g; h < f; h++ {
				dst[g*f+h] += x * v[h]
			}
		}
	}
	mirror(dst, f)
}

func mirror(s []float64, f int) {
	for g := range f {
		for h := g + 1; h < f; h++ {
			s[h*f+g] = s[g*f+h]
		}
	}
}

// cholesky factors the symmetric n × n matrix h = L·L' in place (lower
// triangle). It says false at a pivot that is not above tiny times the diagonal.
func cholesky(h []float64, n int, tiny float64) bool {
	for c := range n {
		d := h[c*n+c]
		d0 := d
		for q := range c {
			d -= h[c*n+q] * h[c*n+q]
		}
		if !(d > tiny*d0) {
			return false
		}
		d = math.Sqrt(d)
		h[c*n+c] = d
		for r := c + 1; r < n; r++ {
			v := h[r*n+c]
			for q := range c {
				v -= h[r*n+q] * h[c*n+q]
			}
			h[r*n+c] = v / d
		}
	}
	return true
}

// solveCholesky solves L·L'·x = x in place.
func solveCholesky(l, x []float64, n int) {
	forward(l, x, n)
	for r := n - 1; r >= 0; r-- {
		for q := r + 1; q < n; q++ {
			x[r] -= l[q*n+r] * x[q]
		}
		x[r] /= l[r*n+r]
	}
}

// forward solves L·x = x in place.
func forward(l, x []float64, n int) {
	for r := range n {
		for q := range r {
			x[r] -= l[r*n+q] * x[q]
		}
		x[r] /= l[r*n+r]
	}
}
