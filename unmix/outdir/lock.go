package outdir

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"strconv"
	"time"
)

// The lock is the operating system's lock on a file, not the file itself: it
// ends with its owner, however that ends, and the number of a process that is
// gone and has been given to another one cannot mislead. The number in the file
// is there for people.

var (
	errHeld    = errors.New("locked")            // by another open file
	errRemoved = errors.New("removed meanwhile") // by the former owner
)

// acquire makes the work folder and takes the lock in it.
func acquire(p places) (*os.File, error) {
	// Verify looks at the lock by taking it for a moment, and a former owner may
	// remove what we have just opened: neither is a reason to give up.
	var err error
	for range 20 {
		var f *os.File
		if err = os.Mkdir(p.work, 0o777); err != nil && !errors.Is(err, fs.ErrExist) {
			return nil, cannotWrite(err)
		}
		if f, err = tryLock(p.lock); err == nil {
			if err = writeOwner(f); err != nil {
				return nil, errors.Join(err, p.release(f))
			}
			return f, nil
		}
		if !errors.Is(err, errHeld) && !errors.Is(err, errRemoved) && !errors.Is(err, fs.ErrNotExist) {
			os.Remove(p.work)
			return nil, cannotWrite(err)
		}
		time.Sleep(10 * time.Millisecond)
	}
	if !errors.Is(err, errHeld) {
		return nil, err
	}
	return nil, &Error{ErrLocked, p.dir, lockedBy(p.lock)}
}

func cannotWrite(err error) error {
	return fmt.Errorf("results cannot be written here: %w; make the folder writable or choose another with --out", err)
}

func writeOwner(f *os.File) error {
	if err := f.Truncate(0); err != nil {
		return err
	}
	_, err := f.WriteAt([]byte(strconv.Itoa(os.Getpid())+"\n"), 0)
	return err
}

// owner returns the process number in a lock file, 0 where there is none.
func owner(lock string) int {
	b, err := os.ReadFile(lock)
	if err != nil {
		return 0
	}
	pid, err := strconv.Atoi(string(bytes.TrimSpace(b)))
	if err != nil || pid < 0 {
		return 0
	}
	return pid
}

func lockedBy(lock string) string {
	who := "another run"
	if pid := owner(lock); pid != 0 {
		who = fmt.Sprintf("process %d", pid)
	}
	return who + " is writing results here; wait until it is done, or end it, and run again (nothing was touched)"
}

// running reports whether a run holds the lock, and its process number where
// that can be told.
func (p places) running() (pid int, yes bool) {
	if !isLocked(p.lock) {
		return 0, false
	}
	return owner(p.lock), true
}

// release gives the lock back and removes the work folder. If anything is left
// in it the lock file stays too: by it the folder is known to be ours.
func (p places) release(f *os.File) error {
	if list, err := os.ReadDir(p.work); err != nil || len(list) > 1 {
		return f.Close()
	}
	err := unlock(f, p.lock)
	os.Remove(p.work) // fails, as it should, once another run has taken it over
	return err
}
