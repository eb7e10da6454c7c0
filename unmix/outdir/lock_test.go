package outdir

import (
	"errors"
	"path/filepath"
	"sync"
	"sync/atomic"
	"testing"
	"time"
)

// Nobody holds the lock beside another, although every owner removes the file
// while others are opening it.
func TestLockHasOneOwner(t *testing.T) {
	name := filepath.Join(t.TempDir(), "lock")
	var owners, taken atomic.Int32
	var wg sync.WaitGroup
	for range 4 {
		wg.Go(func() {
			for taken.Load() < 400 {
				f, err := tryLock(name)
				if err != nil {
					if !errors.Is(err, errHeld) && !errors.Is(err, errRemoved) {
						t.Error(err)
						return
					}
					continue
				}
				taken.Add(1)
				if n := owners.Add(1); n != 1 {
					t.Errorf("%d owners at once", n)
				}
				time.Sleep(10 * time.Microsecond) // lets the others try
				owners.Add(-1)
				if err := unlock(f, name); err != nil {
					t.Error(err)
				}
			}
		})
	}
	wg.Wait()
}

// Where a swap could not be undone its mark stays, and the folder that holds it
// is still known to be ours.
func TestWorkFolderLeftBehind(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	s := begin(t, dir)
	write(t, s.swapping, "")
	if err := s.Abort(); err != nil {
		t.Fatal(err)
	}
	if r, err := Verify(dir); err != nil || !r.Whole() || r.Running || r.Interrupted == "" {
		t.Errorf("%v %v", r.Lines(), err)
	}
	if got := afterwards(t, dir); got != 1 {
		t.Errorf("generation %d", got)
	}
}
