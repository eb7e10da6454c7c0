package nnls

import "testing"

func BenchmarkProject(b *testing.B) {
	for _, k := range []int{2, 4, 6, 8} {
		v := make([]float64, 4756)
		q := make([]float64, 4756*k)
		c := make([]float64, k)
		for i := range v {
			v[i] = float64(i)
		}
		b.Run(string(rune('0'+k)), func(b *testing.B) {
			for b.Loop() {
				for at := 0; at < len(v); at += block {
					e := min(at+block, len(v))
					project(c, v[at:e], panel{q[at*k : e*k], e - at})
				}
			}
			b.ReportMetric(float64(2*4756*k)*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
	b.Run("squares", func(b *testing.B) {
		v := make([]float64, 4756)
		for b.Loop() {
			sumSquares(v)
		}
	})
}
