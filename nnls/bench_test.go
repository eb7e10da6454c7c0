package nnls_test

import (
	"encoding/binary"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"testing"

	"gonum.org/v1/gonum/mat"

	"tarnlight/nnls"
)

// survey draws a batch: n smooth bands over m
// rows, samples mixed from them with 1 % of noise, a third of the amounts zero.
// With gaps, each sample misses one run of rows of its own, up to a fifth of
// them, and every fiftieth row or so beside.
func survey(s surveyShape) (a, b *mat.Dense) {
	samples, m, n := s.samples, s.m, s.n
	d := newDraw(samples + m + n)
	a = mat.NewDense(m, n, nil)
	for j := range n {
		centre, width := d.unit(), 0.1+0.2*d.unit()
		for k := range m {
			u := (float64(k)/float64(m) - centre) / width
			a.Set(k, j, 1/(1+float64(u*u))) // a Lorentz band: the same bits everywhere
		}
	}
	b = mat.NewDense(samples, m, nil)
	for i := range samples {
		x := make([]float64, n)
		for j := range x {
			x[j] = max(0, 3*d.unit()-1)
		}
		row := b.RawRowView(i)
		for k := range row {
			v := float64(0.01 * d.sym())
			for j, aj := range a.RawRowView(k) {
				v += float64(aj * x[j])
			}
			row[k] = v
		}
		if s.gaps {
			from := int(d.unit() * float64(m))
			length := int(d.unit() * float64(m) / 5)
			for k := from; k < min(m, from+length); k++ {
				row[k] = math.NaN()
			}
			for k := d.integer(0, 99); k < m; k += d.integer(1, 99) {
				row[k] = math.NaN()
			}
		}
	}
	return a, b
}

type surveyShape struct {
	samples, m, n int
	gaps          bool
}

var surveys = []surveyShape{
	{1000, 4756, 6, false},
	{1000, 4756, 6, true},
	{100000, 500, 8, false},
	{100000, 500, 8, true},
}

func (s surveyShape) String() string {
	name := fmt.Sprintf("%dx%dx%d", s.samples, s.m, s.n)
	if s.gaps {
		name += "gaps"
	}
	return name
}

var surveyDir = flag.String("survey", "", "write the surveys of BenchmarkBatch and their answers to this folder")

// TestWriteSurveys writes a, b and x of each survey as raw float64, by rows, for
// testdata/nnls/ratio.py.
func TestWriteSurveys(t *testing.T) {
	if *surveyDir == "" {
		t.Skip("-survey not set")
	}
	for _, s := range surveys {
		a, b := survey(s)
		x := mat.NewDense(s.samples, s.n, nil)
		batch, err := nnls.NewBatch(a, nil)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := batch.SolveTo(x, b, nil); err != nil {
			t.Fatal(err)
		}
		for name, v := range map[string]*mat.Dense{"a": a, "b": b, "x": x} {
			f, err := os.Create(filepath.Join(*surveyDir, s.String()+"."+name))
			if err != nil {
				t.Fatal(err)
			}
			err = binary.Write(f, binary.NativeEndian, v.RawMatrix().Data)
			if err = errors.Join(err, f.Close()); err != nil {
				t.Fatal(err)
			}
		}
	}
}

func BenchmarkBatch(b *testing.B) {
	for _, s := range surveys {
		b.Run(s.String(), func(b *testing.B) {
			a, rhs := survey(s)
			x := mat.NewDense(s.samples, s.n, nil)
			b.ReportAllocs()
			for b.Loop() {
				batch, err := nnls.NewBatch(a, nil)
				if err != nil {
					b.Fatal(err)
				}
				if _, err := batch.SolveTo(x, rhs, nil); err != nil {
					b.Fatal(err)
				}
			}
			flops := 2 * float64(s.samples) * float64(s.m) * float64(s.n)
			b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
}

// BenchmarkMatrixProduct is the rate of gonum's product, the measure of
// BenchmarkBatch's GF/s: of a large dense one, and of the shape that a batch takes.
func BenchmarkMatrixProduct(b *testing.B) {
	for _, shape := range [][3]int{{1000, 1000, 1000}, {1000, 4756, 6}} {
		b.Run(fmt.Sprintf("%dx%dx%d", shape[0], shape[1], shape[2]), func(b *testing.B) {
			d := newDraw(1)
			x, y := mat.NewDense(shape[0], shape[1], nil), mat.NewDense(shape[1], shape[2], nil)
			for _, m := range []*mat.Dense{x, y} {
				m.Apply(func(_, _ int, _ float64) float64 { return d.sym() }, m)
			}
			z := mat.NewDense(shape[0], shape[2], nil)
			for b.Loop() {
				z.Mul(x, y)
			}
			flops := 2 * float64(shape[0]) * float64(shape[1]) * float64(shape[2])
			b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
}

func BenchmarkSolveTo(b *testing.B) {
	a, rhs := survey(surveyShape{1, 4756, 6, false})
	x := make([]float64, 6)
	for b.Loop() {
		if _, err := nnls.SolveTo(x, a, rhs.RawRowView(0), nil); err != nil {
			b.Fatal(err)
		}
	}
}
