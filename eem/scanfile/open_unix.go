//go:build unix

package scanfile

import (
	"io/fs"
	"os"
	"syscall"
)

// openFile opens a file for reading. os.Open offers every file to the runtime's
// poller, which for a regular file are four system calls for nothing: they were
// 10 µs of the 31 µs that a scan of 2 kB took to load, 5,000 times a survey.
func openFile(path string) (*os.File, error) {
	for {
		fd, err := syscall.Open(path, syscall.O_RDONLY|syscall.O_CLOEXEC, 0)
		switch err {
		case nil:
			return os.NewFile(uintptr(fd), path), nil
		case syscall.EINTR:
		default:
			return nil, &fs.PathError{Op: "open", Path: path, Err: err}
		}
	}
}
