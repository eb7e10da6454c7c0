package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"
)

// Hold locks what lies beside a file of that name, such as a run sheet, against
// other runs until release is called; release removes the file. The lock ends with
// its owner, however that ends. The error is an *Error of kind ErrLocked, with the
// number of the process, where another run holds it.
func Hold(name string) (release func() error, err error) {
	for range 20 {
		var f *os.File
		if f, err = tryLock(name); err == nil {
			if err = writeOwner(f); err != nil {
				return nil, errors.Join(err, unlock(f, name))
			}
			return func() error { return unlock(f, name) }, nil
		}
		if !errors.Is(err, errHeld) && !errors.Is(err, errRemoved) && !errors.Is(err, fs.ErrNotExist) {
			return nil, err
		}
		time.Sleep(10 * time.Millisecond)
	}
	if !errors.Is(err, errHeld) {
		return nil, err
	}
	who := "another run"
	if pid := owner(name); pid != 0 {
		who = fmt.Sprintf("process %d", pid)
	}
	return nil, &Error{ErrLocked, filepath.Dir(name), who + " is at work here; wait until it is done, or end it, and run again (nothing was touched)"}
}

// OpenElsewhere returns an *Error of kind ErrOpenElsewhere if another program has
// the file open, as far as that can be told.
func OpenElsewhere(file string) error {
	if busy(file) {
		return &Error{ErrOpenElsewhere, file, "is open in another program; close it there and run again (nothing was touched)"}
	}
	dir := filepath.Dir(file)
	list, err := os.ReadDir(dir)
	if err != nil {
		return err
	}
	for _, d := range list {
		if ownedBy(filepath.Join(dir, d.Name())) == filepath.Join(dir, filepath.Base(file)) {
			return &Error{ErrOpenElsewhere, file, leftBehind(d.Name())}
		}
	}
	return nil
}

func leftBehind(owner string) string {
	return "is open in another program; close it there and run again (nothing was touched). " +
		"If it is open nowhere, that program left " + owner + " behind: delete that file"
}
