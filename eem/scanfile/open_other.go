//go:build !unix

package scanfile

import (
	"io/fs"
	"os"
)

// openFile opens a file and says what it is and how large.
func openFile(path string) (f *os.File, mode fs.FileMode, size int64, err error) {
	if f, err = os.Open(path); err != nil {
		return nil, 0, 0, err
	}
	info, err := f.Stat()
	if err != nil {
		f.Close()
		return nil, 0, 0, err
	}
	return f, info.Mode(), info.Size(), nil
}
