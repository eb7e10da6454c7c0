package nnls_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// Two overlapping bands, of which the sample holds only the first: how sure is
// the amount of the first, and how much of the second could be there?
func ExampleCovariance() {
	a := mat.NewDense(5, 2, []float64{
		0.1, 0.9,
		0.5, 0.8,
		1.0, 0.5,
		0.6, 0.2,
		0.2, 0.05,
	})
	b := []float64{0.18, 0.97, 2.03, 1.19, 0.41}
	x := make([]float64, 2)
	res, err := nnls.SolveTo(x, a, b, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	spread, err := nnls.Covariance(a, b, x, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	s := math.Sqrt(res.Variance())
	fmt.Printf("first  %.3f ± %.3f\n", x[0], s*spread.U[0])
	fmt.Printf("second %.3f, less than %.3f (95 %%)\n", x[1], spread.Upper(1, s, nnls.Z95))
	// Output:
	// first  2.005 ± 0.019
	// second 0.000, less than 0.005 (95 %)
}

// leastSquares returns x and (aᵀ·a)⁻¹ of the given columns by gonum's SVD.
func leastSquares(a *mat.Dense, b []float64, columns []int) (x []float64, cov *mat.Dense) {
	m, _ := a.Dims()
	part := mat.NewDense(m, len(columns), nil)
	for to, from := range columns {
		part.SetCol(to, mat.Col(nil, from, a))
	}
	var svd mat.SVD
	svd.Factorize(part, mat.SVDThin)
	var u, v mat.Dense
	svd.UTo(&u)
	svd.VTo(&v)
	s := svd.Values(nil)
	for j := range s {
		copyColumn(&v, j, j, 1/s[j])
	}
	var c, ub, xv mat.Dense
	c.Mul(&v, v.T())
	ub.Mul(u.T(), mat.NewDense(m, 1, b))
	xv.Mul(&v, &ub)
	return mat.Col(nil, 0, &xv), &c
}

// TestCovariance compares with least squares on the positive variables, and for
// a variable at zero on those and itself (METHODS 4.2), by another factorisation.
// The standard deviations certified by NIST are checked in TestReferenceData.
func TestCovariance(t *testing.T) {
	a, b := gapped(60)
	m, n := a.Dims()
	d := newDraw(5)
	weights := make([]float64, m)
	for k := range weights {
		weights[k] = 0.5 + d.unit()
	}
	settings := &nnls.Settings{Weights: weights}
	batch := newBatch(t, a, settings)
	x := mat.NewDense(60, n, nil)
	results, err := batch.SolveTo(x, b, nil)
	if err != nil {
		t.Fatal(err)
	}
	zeros := 0
	for i := range 60 {
		if i%5 > 2 {
			continue // hardly any rows left: condition too high for digits
		}
		row, w := append([]float64(nil), b.RawRowView(i)...), append([]float64(nil), weights...)
		for k, v := range row {
			if math.IsNaN(v) {
				row[k], w[k] = 0, 0
			}
		}
		wa, wb := weighted(a, row, w)
		one, err := nnls.Covariance(a, row, x.RawRowView(i), &nnls.Settings{Weights: w})
		if err != nil {
			t.Fatal(err)
		}
		own, err := batch.Covariance(b.RawRowView(i), x.RawRowView(i), nil)
		if err != nil {
			t.Fatal(err)
		}
		for name, got := range map[string]*nnls.Spread{"Covariance": one, "Batch.Covariance": own} {
			name = fmt.Sprintf("%s, sample %d", name, i)
			free := indices(results[i].Passive)
			_, cov := leastSquares(wa, wb, free)
			for q, j := range free {
				for r, l := range free {
					size := math.Sqrt(cov.At(q, q) * cov.At(r, r))
					if !(math.Abs(got.Cov.At(j, l)-cov.At(q, r)) <= 1e-9*size) {
						t.Errorf("%s: covariance[%d,%d] = %g, want %g", name, j, l, got.Cov.At(j, l), cov.At(q, r))
					}
				}
			}
			for j, v := range x.RawRowView(i) {
				with := free
				if v == 0 {
					with = append(append([]int(nil), free...), j)
					zeros++
				}
				ls, cov := leastSquares(wa, wb, with)
				for q, l := range with {
					if l == j {
						near(t, name+" u", []float64{got.U[j]}, []float64{math.Sqrt(cov.At(q, q))}, 1e-9, 0)
						if !(math.Abs(got.Free[j]-ls[q]) <= 1e-9*(got.U[j]+math.Abs(ls[q]))) {
							t.Errorf("%s: free estimate of %d %g, want %g", name, j, got.Free[j], ls[q])
						}
						if v == 0 && got.Cov.At(j, j) != 0 {
							t.Errorf("%s: variance %g of a variable at zero", name, got.Cov.At(j, j))
						}
						up := max(0, ls[q]+2*0.1*math.Sqrt(cov.At(q, q)))
						near(t, name+" limit", []float64{got.Upper(j, 0.1, 2)}, []float64{up}, 1e-8, 0)
					}
				}
			}
		}
	}
	if zeros < 20 {
		t.Errorf("only %d variables at zero", zeros)
	}
}

// TestUpperLimitCovers draws data around known amounts, one of them too small to
// be seen: the truth must lie below the one-sided 95 % limit in 95 of 100 cases.
// 4,000 draws have a standard error of 0.34 %; the test allows three.
func TestUpperLimitCovers(t *testing.T) {
	a := dense([][]float64{{0.1, 0.9}, {0.5, 0.8}, {1.0, 0.5}, {0.6, 0.2}, {0.2, 0.05}})
	truth := []float64{2, 0.01}
	const draws, sd = 4000, 0.05
	d := newDraw(11)
	clean := product(a, truth)
	below, zeros := 0, 0
	for range draws {
		b := append([]float64(nil), clean...)
		for k := range b {
			b[k] += sd * normal(d)
		}
		x, _ := solveOne(t, a, b)
		spread, err := nnls.Covariance(a, b, x, nil)
		if err != nil {
			t.Fatal(err)
		}
		if x[1] == 0 {
			zeros++
		}
		if truth[1] <= spread.Upper(1, sd, nnls.Z95) {
			below++
		}
	}
	share := float64(below) / draws
	t.Logf("%.2f %% of the limits hold; %d of %d answers are zero", 100*share, zeros, draws)
	if math.Abs(share-0.95) > 0.0105 || zeros < draws/4 {
		t.Errorf("%.2f %% of the limits hold, want 95", 100*share)
	}
}

// normal is a standard normal deviate (Box & Muller, Ann. Math. Stat. 1958, 29, 610).
func normal(d *draw) float64 {
	return math.Sqrt(-2*math.Log(1-d.unit())) * math.Cos(2*math.Pi*d.unit())
}

// TestUndetermined: data that say nothing about a variable set no limit on it.
func TestUndetermined(t *testing.T) {
	a := mat.NewDense(4, 4, []float64{
		1, 3, 0, 1,
		0.1, 0.3, 0, 0,
		0.7, 2.1, 0, -2,
		0, 0, 0, 1,
	}) // the second column is three times the first, the third zero
	b := []float64{1, 0.1, 0.7, -1}
	x, res := solveOne(t, a, b)
	spread, err := nnls.Covariance(a, b, x, nil)
	if err != nil {
		t.Fatal(err)
	}
	own, err := newBatch(t, a, nil).Covariance(b, x, nil)
	if err != nil {
		t.Fatal(err)
	}
	if x[3] != 0 || math.IsInf(spread.U[3], 1) {
		t.Errorf("the fourth variable is %g ± %g, want a limit on a zero", x[3], spread.U[3])
	}
	for j, free := range res.Passive[:3] {
		if free == math.IsInf(spread.Upper(j, 1, nnls.Z95), 1) || free == math.IsInf(own.U[j], 1) {
			t.Errorf("variable %d, free %v: limit %g", j, free, spread.Upper(j, 1, nnls.Z95))
		}
	}
}
