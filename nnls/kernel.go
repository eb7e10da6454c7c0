package nnls

// block is the number of rows summed at a time: the rounding error of a sum over
// m rows grows with block + m/block instead of m, and a block of Q stays in the
// first-level cache.
const block = 256

// padded returns k rounded up to the even number of columns that the kernels
// work on.
func padded(k int) int { return (k + 1) &^ 1 }

// project adds qᵀ·v to c. The matrix q has len(v) rows of stride len(c), which
// is even. Each sum runs over the rows in order, whatever the machine or the
// samples beside it. Plain Go with as many running sums as the registers hold
// measured three times faster than a general matrix product of so few columns.
func project(c, v, q []float64) {
	stride := len(c)
	if len(v) == 0 {
		return
	}
	for p := 0; p < stride; {
		switch left := stride - p; {
		case left >= 8:
			project8(c[p:p+8], v, q[p:], stride)
			p += 8
		case left == 6:
			project6(c[p:p+6], v, q[p:], stride)
			p += 6
		case left == 4:
			project4(c[p:p+4], v, q[p:], stride)
			p += 4
		default:
			project2(c[p:p+2], v, q[p:], stride)
			p += 2
		}
	}
}

func project8(c, v, q []float64, stride int) {
	var c0, c1, c2, c3, c4, c5, c6, c7 float64
	at := 0
	for _, x := range v {
		// Two slices of four: with one of eight the compiler schedules all
		// products first and spills a running sum, at half the speed.
		r := q[at : at+4 : at+4]
		c0 += x * r[0]
		c1 += x * r[1]
		c2 += x * r[2]
		c3 += x * r[3]
		r = q[at+4 : at+8 : at+8]
		c4 += x * r[0]
		c5 += x * r[1]
		c6 += x * r[2]
		c7 += x * r[3]
		at += stride
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
	c[4] += c4
	c[5] += c5
	c[6] += c6
	c[7] += c7
}

func project6(c, v, q []float64, stride int) {
	var c0, c1, c2, c3, c4, c5 float64
	at := 0
	for _, x := range v {
		r := q[at : at+6 : at+6]
		c0 += x * r[0]
		c1 += x * r[1]
		c2 += x * r[2]
		c3 += x * r[3]
		c4 += x * r[4]
		c5 += x * r[5]
		at += stride
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
	c[4] += c4
	c[5] += c5
}

func project4(c, v, q []float64, stride int) {
	var c0, c1, c2, c3 float64
	at := 0
	for _, x := range v {
		r := q[at : at+4 : at+4]
		c0 += x * r[0]
		c1 += x * r[1]
		c2 += x * r[2]
		c3 += x * r[3]
		at += stride
	}
	c[0] += c0
	c[1] += c1
	c[2] += c2
	c[3] += c3
}

func project2(c, v, q []float64, stride int) {
	var c0, c1 float64
	at := 0
	for _, x := range v {
		r := q[at : at+2 : at+2]
		c0 += x * r[0]
		c1 += x * r[1]
		at += stride
	}
	c[0] += c0
	c[1] += c1
}

// sumSquares returns Σ v²; NaN or +Inf where v holds one.
func sumSquares(v []float64) float64 {
	var s0, s1, s2, s3 float64
	whole := len(v) &^ 3
	for i := 0; i < whole; i += 4 {
		r := v[i : i+4 : i+4]
		s0 += r[0] * r[0]
		s1 += r[1] * r[1]
		s2 += r[2] * r[2]
		s3 += r[3] * r[3]
	}
	for _, x := range v[whole:] {
		s0 += x * x
	}
	return (s0 + s1) + (s2 + s3)
}
