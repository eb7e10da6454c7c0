package nnls

import (
	"fmt"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func BenchmarkProject(b *testing.B) {
	for _, k := range []int{2, 4, 6, 8} {
		b.Run(fmt.Sprint(k), func(b *testing.B) {
			const m = 4756
			v, c, q := make([]float64, m), make([]float64, k), newPanels(mat.NewDense(m, k, nil))
			for b.Loop() {
				for at := 0; at < m; at += block {
					project(c, v[at:min(at+block, m)], q.at(at))
				}
			}
			b.ReportMetric(float64(2*m*k)*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
}
