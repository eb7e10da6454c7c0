package parafac

import (
	"context"
	"fmt"
	"testing"

	"tarnlight/eem"
	"tarnlight/eem/synth"
)

// bench is the survey of the speed aims: 46 × 151, 5 components, noise 0.5 % of
// the maximum, both Rayleigh bands missing.
func bench(samples int) *eem.Cube {
	c, _ := synth.Trilinear(synth.TrilinearSpec{Samples: samples, Components: 5, Noise: 0.005, Scatter: true, Seed: 1})
	return c
}

func BenchmarkCompress(b *testing.B) {
	for _, n := range []int{200, 1000, 5000} {
		c := bench(n)
		set := (&Settings{}).withDefaults()
		p, err := newProblem(c, 5, &set)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := p.prepare(context.Background(), 5, quarters(p.alone(1)), &set); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkStart is one fit from compressed data, from a random start to its
// tolerance.
func BenchmarkStart(b *testing.B) {
	for _, n := range []int{200, 1000, 5000} {
		c := bench(n)
		set := (&Settings{Starts: 1}).withDefaults()
		p, err := newProblem(c, 5, &set)
		if err != nil {
			b.Fatal(err)
		}
		pr, err := p.prepare(context.Background(), 5, quarters(p.alone(1)), &set)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			b.ReportAllocs()
			defer reportCPU(b)()
			var it, k int
			for b.Loop() {
				set.Seed++
				all, err := runStarts(context.Background(), pr.all, 5, &set, nil)
				if err != nil {
					b.Fatal(err)
				}
				it += all[0].s.iter
				k++
			}
			b.ReportMetric(float64(it)/float64(k), "iterations")
		})
	}
}

// BenchmarkFit is a whole fit of ten starts, with finish and errors.
func BenchmarkFit(b *testing.B) {
	for _, n := range []int{200, 1000, 5000} {
		c := bench(n)
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			b.ReportAllocs()
			defer reportCPU(b)()
			for b.Loop() {
				if _, err := Fit(context.Background(), c, 5, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkChoose is the whole choice: 2 to 7 components, ten starts each and
// those from one component more, split halves.
func BenchmarkChoose(b *testing.B) {
	for _, n := range []int{200, 1000, 5000} {
		c := bench(n)
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			b.ReportAllocs()
			defer reportCPU(b)()
			for b.Loop() {
				if _, err := Choose(context.Background(), c, 2, 7, nil, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
