package nnls_test

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// The worked example of Bro & de Jong, J. Chemom. 1997, 11, 393.
func ExampleSolveTo() {
	a := mat.NewDense(4, 3, []float64{
		73, 71, 52,
		87, 74, 46,
		72, 2, 7,
		80, 89, 71,
	})
	b := []float64{49, 67, 68, 20}
	x := make([]float64, 3)
	res, err := nnls.SolveTo(x, a, b, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("x = %.4f\n", x)
	fmt.Printf("%v, residual norm %.4f, rank %d\n", res.Status, res.Norm, res.Rank)
	fmt.Println("certified:", res.Violation <= 1e-10)
	// Output:
	// x = [0.6495 0.0000 0.0000]
	// optimal, residual norm 39.8126, rank 3
	// certified: true
}

// Three samples share a matrix; the second lacks a row.
func ExampleBatch() {
	a := mat.NewDense(4, 2, []float64{
		1, 0,
		1, 1,
		0, 1,
		1, 2,
	})
	b := mat.NewDense(3, 4, []float64{
		1, 3, 2, 5,
		1, math.NaN(), 2, 5,
		1, 0, -1, -1,
	})
	batch, err := nnls.NewBatch(a, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	x := mat.NewDense(3, 2, nil)
	results, err := batch.SolveTo(x, b, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for i, r := range results {
		fmt.Printf("%.3f from %d rows, certified %v\n", x.RawRowView(i), r.Rows, r.Violation <= 1e-10)
	}
	// Output:
	// [1.000 2.000] from 4 rows, certified true
	// [1.000 2.000] from 3 rows, certified true
	// [0.000 0.000] from 4 rows, certified true
}
