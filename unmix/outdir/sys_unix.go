//go:build unix

package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
)

// tryLock opens the lock file, made if it is not there, and locks it. It returns
// errHeld where another open file has the lock, errRemoved where the file is no
// longer the one of that name.
func tryLock(name string) (*os.File, error) {
	f, err := os.OpenFile(name, os.O_RDWR|os.O_CREATE, 0o666)
	if err != nil {
		return nil, err
	}
	if err := flock(f, syscall.LOCK_EX); err != nil {
		f.Close()
		return nil, err
	}
	mine, err1 := f.Stat()
	named, err2 := os.Stat(name)
	if err1 != nil || err2 != nil || !os.SameFile(mine, named) {
		f.Close()
		return nil, errRemoved
	}
	return f, nil
}

func flock(f *os.File, how int) error {
	for {
		err := syscall.Flock(int(f.Fd()), how|syscall.LOCK_NB)
		switch {
		case errors.Is(err, syscall.EINTR):
			continue
		case errors.Is(err, syscall.EWOULDBLOCK):
			return errHeld
		case err != nil:
			return fmt.Errorf("%s: the file system cannot lock files: %w", f.Name(), err)
		}
		return nil
	}
}

// unlock removes the lock file first: whoever has opened it by then finds that
// it is no longer the one of that name.
func unlock(f *os.File, name string) error {
	return errors.Join(os.Remove(name), f.Close())
}

func isLocked(name string) bool {
	f, err := os.Open(name)
	if err != nil {
		return false
	}
	defer f.Close()
	return errors.Is(flock(f, syscall.LOCK_SH), errHeld)
}

// busy reports whether a file cannot be replaced because a program has it open:
// never so here.
func busy(string) bool { return false }

// replaceable finds the two cases in which a folder in a writable folder cannot
// be renamed.
func replaceable(dir string) error {
	fi, err := os.Lstat(dir)
	if err != nil {
		return nil // absent
	}
	up, err := os.Stat(filepath.Dir(dir))
	if err != nil {
		return err
	}
	d, ok1 := fi.Sys().(*syscall.Stat_t)
	u, ok2 := up.Sys().(*syscall.Stat_t)
	if !ok1 || !ok2 {
		return nil
	}
	if d.Dev != u.Dev {
		return &Error{ErrNotOurs, dir, "is a mount point and cannot be replaced; choose a folder in it with --out"}
	}
	me := os.Geteuid()
	if up.Mode()&fs.ModeSticky != 0 && me != 0 && int(d.Uid) != me && int(u.Uid) != me {
		return &Error{ErrNotOurs, dir, "belongs to another user and cannot be replaced; choose another folder with --out"}
	}
	return nil
}

func rename(from, to string) error { return os.Rename(from, to) }

// syncDir makes the names in a folder durable.
func syncDir(dir string) error {
	f, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer f.Close()
	if err := f.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) { // some network file systems cannot
		return err
	}
	return nil
}
