// Package testkit is what the tests of several packages share: the way to the
// measurements beside the repository, readers for them, and the bounds that every
// reader of files keeps.
package testkit

import (
	"encoding/csv"
	"encoding/json"
	"os"
	"path/filepath"
	"runtime/metrics"
	"testing"
	"time"
)

// Shared returns the path of a file or folder below ../shared of the repository. The
// test is skipped where it is missing: the measurements are no part of a clone.
func Shared(t testing.TB, elem ...string) string {
	t.Helper()
	name := filepath.Join(append([]string{"shared"}, elem...)...)
	p := filepath.Join(filepath.Dir(top(t)), name)
	if _, err := os.Stat(p); err != nil {
		t.Skipf("../%s is not here; it is kept beside the repository", name)
	}
	return p
}

// top is the folder of go.mod, above the package under test.
func top(t testing.TB) string {
	t.Helper()
	dir, err := os.Getwd()
	Must(t, err)
	for {
		if _, err := os.Stat(filepath.Join(dir, "go.mod")); err == nil {
			return dir
		}
		up := filepath.Dir(dir)
		if up == dir {
			t.Fatal("no go.mod above this package")
		}
		dir = up
	}
}

// Must ends the test on an error.
func Must(t testing.TB, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

// Heavy leaves a test out under the race detector, where it takes minutes of processor
// time and runs the same code as the tests that stay.
func Heavy(t testing.TB) {
	t.Helper()
	if Race {
		t.Skip("too long under the race detector; runs without it")
	}
}

// Check reads inputs and expected answers of the entry with the given id from
// ../shared/checks.json.
func Check(t testing.TB, id string, inputs, expected any) {
	t.Helper()
	b, err := os.ReadFile(Shared(t, "checks.json"))
	Must(t, err)
	var all []struct {
		ID               string
		Inputs, Expected json.RawMessage
	}
	Must(t, json.Unmarshal(b, &all))
	for _, c := range all {
		if c.ID == id {
			Must(t, json.Unmarshal(c.Inputs, inputs))
			Must(t, json.Unmarshal(c.Expected, expected))
			return
		}
	}
	t.Fatalf("no check %s", id)
}

// Records reads a CSV file.
func Records(t testing.TB, path string) [][]string {
	t.Helper()
	f, err := os.Open(path)
	Must(t, err)
	defer f.Close()
	rec, err := csv.NewReader(f).ReadAll()
	Must(t, err)
	return rec
}

// Bounded runs a reader of size bytes and fails when it takes more than 1 s per
// 100 kB, or allocates more than 40 times the file: in all, so that what it holds at
// one time stays well under 20 times. 2 MB and a second are for what every reader
// makes; one that is late is asked twice more, as a busy machine may have been.
func Bounded(t testing.TB, size int, read func()) {
	t.Helper()
	limit := time.Second + time.Duration(size)*10*time.Microsecond
	took, allocated := cost(read)
	if allocated > 2<<20+40*uint64(size) {
		t.Errorf("%d bytes allocated for %d", allocated, size)
	}
	for try := 0; took > limit && try < 2; try++ {
		took, _ = cost(read)
	}
	if took > limit {
		t.Errorf("%v for %d bytes", took, size)
	}
}

// cost is what f takes by the clock and allocates in bytes.
func cost(f func()) (took time.Duration, allocated uint64) {
	sample := []metrics.Sample{{Name: "/gc/heap/allocs:bytes"}}
	metrics.Read(sample)
	before, start := sample[0].Value.Uint64(), time.Now()
	f()
	took = time.Since(start)
	metrics.Read(sample)
	return took, sample[0].Value.Uint64() - before
}
