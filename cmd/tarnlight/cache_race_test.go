package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"

	"tarnlight/eem/testkit"
)

// Runs at once, whatever they share, leave the bytes of a fresh run: two that work
// into folders of their own and have one cache; several that want the same folder, of
// which those that come too late say who is at work; one whose cache is deleted while
// it reads, again and again.
func TestCacheAmongRuns(t *testing.T) {
	testkit.Heavy(t)
	dir := t.TempDir()
	if err := smallDemo(t).Write(dir); err != nil {
		t.Fatal(err)
	}
	runNoPictures(t, dir, "--fresh", "--out", filepath.Join(dir, "out.fresh"))
	want := contents(t, filepath.Join(dir, "out.fresh"))
	whole := func(what, out string) {
		t.Helper()
		sameFiles(t, what, contents(t, filepath.Join(dir, out)), want)
		call("verify", filepath.Join(dir, out)).want(t, exitDone)
	}
	// atOnce runs into each of the folders at the same time.
	atOnce := func(outs ...string) []result {
		res := make([]result, len(outs))
		var wg sync.WaitGroup
		for i, out := range outs {
			wg.Go(func() { res[i] = call("run", dir, "--pictures=false", "--out", filepath.Join(dir, out)) })
		}
		wg.Wait()
		return res
	}

	// a.cache and b.cache are one folder, empty at first, then full.
	if err := os.Mkdir(filepath.Join(dir, "a.cache"), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("a.cache", filepath.Join(dir, "b.cache")); err != nil {
		t.Skip("no links here: ", err)
	}
	for _, what := range []string{"an empty cache", "a full cache"} {
		for _, r := range atOnce("a", "b") {
			r.want(t, exitDone, exitDoubt)
		}
		whole(what+", first", "a")
		whole(what+", second", "b")
	}
	if r := call("run", dir, "--pictures=false", "--out", filepath.Join(dir, "b")).want(t, exitDone, exitDoubt); !strings.Contains(r.err, "23 unchanged bottles") {
		t.Errorf("two runs left a cache that is not whole: %s", r.err)
	}

	done := 0
	for _, r := range atOnce("a", "a", "a") {
		switch {
		case r.code == exitFailed && strings.Contains(r.err, fmt.Sprintf("process %d is writing results here; wait until it is done", os.Getpid())):
		case r.code == exitFailed:
			t.Errorf("a run that came too late: %s", r.err)
		default:
			done++
		}
	}
	if done == 0 {
		t.Error("of three runs in one folder none came to its end")
	}
	whole("three in one folder", "a")

	stop, gone := make(chan struct{}), make(chan int)
	go func() {
		n := 0
		for {
			select {
			case <-stop:
				gone <- n
				return
			default:
				if list, err := os.ReadDir(filepath.Join(dir, "a.cache")); err == nil && len(list) > 0 {
					n++
				}
				os.RemoveAll(filepath.Join(dir, "a.cache"))
			}
		}
	}()
	for range 2 {
		call("run", dir, "--pictures=false", "--out", filepath.Join(dir, "a")).want(t, exitDone, exitDoubt)
	}
	close(stop)
	if n := <-gone; n == 0 {
		t.Error("the cache was never there to be deleted")
	}
	whole("a cache that goes while it is read", "a")
}
