//go:build unix

package main

import (
	"context"
	"io"
	"testing"

	"tarnlight/eem/synth"
	"tarnlight/eem/testkit"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// BenchmarkCost holds what is asked of every bottle once it is resolved (budgets,
// limits, residual tests, what the model misses) against reading and correcting the
// same 1,000 samples: it should cost no more.
func BenchmarkCost(b *testing.B) {
	d := erring(7, true)
	d.Samples, d.Days, d.Unknown = 1000, 20, 3
	s := d.Survey()
	s.Settings = erringSettings
	for i := range s.Bottles {
		s.Bottles[i].Layout.Form = synth.Matrix
	}
	dir := b.TempDir()
	if err := s.Write(dir); err != nil {
		b.Fatal(err)
	}
	j := &job{jobOptions: jobOptions{dir: dir, quantify: true}, bar: newBar(io.Discard)}
	b.Run("read and correct", func(b *testing.B) {
		defer processor(b)()
		for range b.N {
			if err := j.readInputs(); err != nil {
				b.Fatal(err)
			}
			if err := j.prepare(context.Background()); err != nil {
				b.Fatal(err)
			}
		}
	})
	set, err := j.references()
	if err != nil {
		b.Fatal(err)
	}
	set.Method = "references"
	r, err := unmix.Quantify(j.cube, set)
	if err != nil {
		b.Fatal(err)
	}
	var bottles []merit.Bottle
	for _, x := range j.sv.Bottles {
		bottles = append(bottles, j.merit(x))
	}
	var spreads []merit.Spread
	var judged *merit.Judged
	var src *merit.Sources
	b.Run("budgets and limits", func(b *testing.B) {
		defer processor(b)()
		for range b.N {
			src = j.sources(r)
			spreads = merit.Spreads(j.cube, r, src)
		}
	})
	b.Run("judgement", func(b *testing.B) {
		defer processor(b)()
		for range b.N {
			judged = merit.Judge(r, spreads, bottles, j.cube.Sample, j.sv.Limit, j.sv.Accept, set.Origin)
		}
	})
	b.Run("unknowns", func(b *testing.B) {
		defer processor(b)()
		for range b.N {
			judged.Unknown, judged.Beyond = nil, nil
			if err := j.unknowns(judged, r, bottles, src, set.Origin); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("tables", func(b *testing.B) {
		defer processor(b)()
		j.res, j.judge = []*unmix.Resolution{r}, []*merit.Judged{judged}
		for range b.N {
			j.limitsTable()
			j.budgetTable()
		}
	})
}

// processor reports the processor time of a benchmark: on a machine that does other
// things besides, the clock tells less.
func processor(b *testing.B) func() {
	before := testkit.ProcessorTime(b)
	return func() { b.ReportMetric((testkit.ProcessorTime(b)-before).Seconds()/float64(b.N), "cpu-s/op") }
}
