package testkit

import (
	"fmt"
	"path/filepath"
	"slices"
	"testing"
	"testing/synctest"
	"time"
)

// said is a testing.TB that keeps what it is told.
type said struct {
	testing.TB
	errors []string
}

func (s *said) Helper()                      {}
func (s *said) Errorf(f string, args ...any) { s.errors = append(s.errors, fmt.Sprintf(f, args...)) }

// A reader that is slow each time, or that takes too much, is told; one that was
// late once is not.
func TestBounded(t *testing.T) { synctest.Test(t, testBounded) } // sleeps take no time there

func testBounded(t *testing.T) {
	slow, greedy, late := &said{TB: t}, &said{TB: t}, &said{TB: t}
	Bounded(slow, 10, func() { time.Sleep(1050 * time.Millisecond) })
	var kept [][]byte
	Bounded(greedy, 10, func() { kept = append(kept, make([]byte, 3<<20)) })
	first := true
	Bounded(late, 10, func() {
		if first {
			time.Sleep(1050 * time.Millisecond)
		}
		first = false
	})
	if len(slow.errors) != 1 || len(greedy.errors) != 1 || len(late.errors) != 0 || len(kept) != 1 {
		t.Errorf("slow %q, greedy %q, late %q", slow.errors, greedy.errors, late.errors)
	}
}

// An array in Fortran order is turned, as numpy.asarray(…, order="C") does.
func TestLastFastest(t *testing.T) {
	got := lastFastest([]float64{1, 4, 2, 5, 3, 6}, []int{2, 3})
	if !slices.Equal(got, []float64{1, 2, 3, 4, 5, 6}) {
		t.Errorf("%v", got)
	}
}

// The sugar spectra have the shape that the README beside them states.
func TestNpy(t *testing.T) {
	x, shape := Npy(t, Shared(t, filepath.Join("data", "sugar_process", "X.npy")))
	if !slices.Equal(shape, []int{134, 571, 7}) || len(x) != 134*571*7 {
		t.Errorf("shape %v, %d numbers", shape, len(x))
	}
}
