//go:build unix

package scanfile

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"sync"
	"sync/atomic"
	"syscall"
	"testing"
	"time"
)

// Size of the folder that the benchmark reads: 82 bottles of 61 scans as stacks
// and 100 bottles as grids, wavelengths as in the amino-acid measurements.
const benchStacks, benchGrids, benchEx, benchEm = 5000, 100, 61, 201

// writeFolder writes the files that BenchmarkFolder reads; intensities have up
// to six digits, as detectors report them.
func writeFolder(tb testing.TB, dir string) {
	tb.Helper()
	rnd := rand.New(rand.NewPCG(1, 2))
	f := func() string {
		return strconv.FormatFloat(math.Round(1000*rnd.ExpFloat64()*100)/1000, 'g', -1, 64)
	}
	write := func(name string, b *bytes.Buffer) {
		if err := os.WriteFile(filepath.Join(dir, name), b.Bytes(), 0o644); err != nil {
			tb.Fatal(err)
		}
		b.Reset()
	}
	for _, d := range []string{"stack", "grid"} {
		if err := os.MkdirAll(filepath.Join(dir, d), 0o755); err != nil {
			tb.Fatal(err)
		}
	}
	var b bytes.Buffer
	for i := range benchStacks {
		ex := 240 + i%benchEx
		fmt.Fprintf(&b, "# sample: S%d\n# excitation_nm: %d\nem_nm\tintensity\n", i/benchEx, ex)
		for k := range benchEm {
			fmt.Fprintf(&b, "%d\t%s\n", 250+k, f())
		}
		write(fmt.Sprintf("stack/S%d_ex%d.txt", i/benchEx, ex), &b)
	}
	for i := range benchGrids {
		b.WriteString(`em_nm\ex_nm`)
		for j := range benchEx {
			fmt.Fprintf(&b, ",%d", 240+j)
		}
		for k := range benchEm {
			fmt.Fprintf(&b, "\n%d", 250+k)
			for range benchEx {
				b.WriteString("," + f())
			}
		}
		b.WriteString("\n")
		write(fmt.Sprintf("grid/S%d.csv", i), &b)
	}
}

// usage is processor time and wall time, s, for stacks and for grids, and the
// largest resident memory, MB.
type usage struct {
	cpu, wall [2]float64
	peak      float64
}

func newUsage() usage {
	inf := [2]float64{math.Inf(1), math.Inf(1)}
	return usage{cpu: inf, wall: inf}
}

// ownUsage is the processor time of this process, of all its threads.
func ownUsage(tb testing.TB) (cpu, peak float64) {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		tb.Fatal(err)
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano()).Seconds(), float64(u.Maxrss) / 1024
}

// BenchmarkFolder reads 5,000 stack files and 100 grid files with nothing set, on
// all cores, and beside it the NumPy script of testdata/scanfile on the same
// files. The ratio of wall times is what a user sees (the aim is 3 on two cores);
// the ratio of processor times, the collector's included, is per core. Of every
// time the shortest of several runs counts on both sides, which is the one least
// disturbed. The sums of all intensities must agree.
func BenchmarkFolder(b *testing.B) {
	dir := b.TempDir()
	writeFolder(b, dir)
	took := newUsage()
	var sum float64
	b.ReportAllocs()
	for b.Loop() {
		sum = 0
		for i, pattern := range []string{"stack/*.txt", "grid/*.csv"} {
			cpu, _ := ownUsage(b)
			start := time.Now()
			sum += readFolder(b, filepath.Join(dir, pattern))
			took.wall[i] = min(took.wall[i], time.Since(start).Seconds())
			end, peak := ownUsage(b)
			took.cpu[i] = min(took.cpu[i], end-cpu)
			took.peak = peak
		}
	}
	b.ReportMetric(took.cpu[0]*1e6/benchStacks, "µs/stack")
	b.ReportMetric(took.cpu[1]*1e3/benchGrids, "ms/grid")
	b.ReportMetric(took.peak, "MB")
	numpy, want, ok := numpyUsage(b, dir)
	if !ok {
		return
	}
	if math.Abs(sum-want) > 1e-6*math.Abs(want) {
		b.Fatalf("sum %.6f, NumPy %.6f", sum, want)
	}
	b.ReportMetric(numpy.peak, "MB-numpy")
	b.ReportMetric((numpy.cpu[0]+numpy.cpu[1])/(took.cpu[0]+took.cpu[1]), "×numpy-core")
	b.ReportMetric((numpy.wall[0]+numpy.wall[1])/(took.wall[0]+took.wall[1]), "×numpy")
}

// readFolder reads the files on as many goroutines as there are cores and adds
// up all intensities, file by file in the order of names.
func readFolder(b *testing.B, pattern string) float64 {
	paths := glob(b, pattern)
	sums := make([]float64, len(paths))
	var next atomic.Int64
	var wg sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		wg.Go(func() {
			for i := next.Add(1) - 1; i < int64(len(paths)); i = next.Add(1) - 1 {
				f, err := Read(paths[i], nil)
				if err != nil {
					b.Error(err)
					return
				}
				for _, s := range f.Scans {
					for _, v := range s.F {
						sums[i] += v
					}
				}
			}
		})
	}
	wg.Wait()
	total := 0.0
	for _, v := range sums {
		total += v
	}
	return total
}

// numpyUsage runs the script, three times.
func numpyUsage(b *testing.B, dir string) (u usage, sum float64, ok bool) {
	script := filepath.Join("..", "..", "testdata", "scanfile", "read_with_numpy.py")
	u = newUsage()
	for range 3 {
		out, err := exec.Command("/usr/bin/python3", script, dir).Output()
		if err != nil {
			b.Logf("no comparison: %v (Debian's python3-numpy is needed)", err)
			return u, 0, false
		}
		var v usage
		if _, err := fmt.Sscan(string(out), &v.cpu[0], &v.cpu[1], &v.wall[0], &v.wall[1], &sum, &u.peak); err != nil {
			b.Fatal(err)
		}
		for i := range 2 {
			u.cpu[i], u.wall[i] = min(u.cpu[i], v.cpu[i]), min(u.wall[i], v.wall[i])
		}
	}
	return u, sum, true
}
