package outdir

import (
	"errors"
	"os"
	"syscall"
	"time"
)

const (
	errSharing = syscall.Errno(32) // ERROR_SHARING_VIOLATION
	errRegion  = syscall.Errno(33) // ERROR_LOCK_VIOLATION

	accessDelete = 0x10000 // DELETE
)

// open opens what must exist unless create is given, and shares it as stated.
func open(name string, access, share, create, flags uint32) (syscall.Handle, error) {
	p, err := syscall.UTF16PtrFromString(name)
	if err != nil {
		return syscall.InvalidHandle, err
	}
	h, err := syscall.CreateFile(p, access, share, nil, create, flags, 0)
	if errors.Is(err, errSharing) || errors.Is(err, errRegion) {
		return syscall.InvalidHandle, errHeld
	}
	if err != nil {
		return syscall.InvalidHandle, &os.PathError{Op: "open", Path: name, Err: err}
	}
	return h, nil
}

// tryLock opens the lock file for writing, which the system allows to one at a
// time because it shares reading only. It returns errHeld where another open
// file has the lock.
func tryLock(name string) (*os.File, error) {
	h, err := open(name, syscall.GENERIC_READ|syscall.GENERIC_WRITE, syscall.FILE_SHARE_READ,
		syscall.OPEN_ALWAYS, syscall.FILE_ATTRIBUTE_NORMAL)
	if err != nil {
		return nil, err
	}
	return os.NewFile(uintptr(h), name), nil
}

// unlock closes the lock file and removes it unless another run has it by then:
// a file that is open without delete sharing cannot be removed.
func unlock(f *os.File, name string) error {
	err := f.Close()
	os.Remove(name)
	return err
}

func isLocked(name string) bool {
	h, err := open(name, syscall.GENERIC_READ|syscall.GENERIC_WRITE, syscall.FILE_SHARE_READ,
		syscall.OPEN_EXISTING, syscall.FILE_ATTRIBUTE_NORMAL)
	if err != nil {
		return errors.Is(err, errHeld)
	}
	syscall.CloseHandle(h)
	return false
}

// busy reports whether a file or folder cannot be replaced because a program
// has it open. Virus scanners have every new file open for a moment.
func busy(name string) bool {
	fi, err := os.Lstat(name)
	if err != nil {
		return false
	}
	access, share, flags := uint32(syscall.GENERIC_READ), uint32(0), uint32(syscall.FILE_ATTRIBUTE_NORMAL)
	if fi.IsDir() {
		access, flags = accessDelete, syscall.FILE_FLAG_BACKUP_SEMANTICS
		share = syscall.FILE_SHARE_READ | syscall.FILE_SHARE_WRITE | syscall.FILE_SHARE_DELETE
	}
	for range 10 {
		h, err := open(name, access, share, syscall.OPEN_EXISTING, flags)
		if err == nil {
			syscall.CloseHandle(h)
			return false
		}
		if !errors.Is(err, errHeld) {
			return false
		}
		time.Sleep(50 * time.Millisecond)
	}
	return true
}

func replaceable(string) error { return nil }

// rename waits a little for virus scanners and indexers to let go.
func rename(from, to string) error {
	var err error
	for range 20 {
		err = os.Rename(from, to)
		if err == nil || !errors.Is(err, errSharing) && !errors.Is(err, syscall.ERROR_ACCESS_DENIED) {
			return err
		}
		time.Sleep(100 * time.Millisecond)
	}
	return err
}

// syncDir does nothing: a folder cannot be flushed here.
func syncDir(string) error { return nil }
