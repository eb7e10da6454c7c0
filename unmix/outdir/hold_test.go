package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// One at a time holds the lock of a file; the other is told who does. A file that a
// dead owner left counts for nothing, and none is left by a living one.
func TestHold(t *testing.T) {
	name := filepath.Join(t.TempDir(), "runsheet.lock")
	if err := os.WriteFile(name, []byte("1\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	release, err := Hold(name)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Hold(name); !errors.Is(err, ErrLocked) || !strings.Contains(err.Error(), fmt.Sprintf("process %d is at work here", os.Getpid())) {
		t.Errorf("error %v", err)
	}
	if err := release(); err != nil {
		t.Error(err)
	}
	if _, err := os.Stat(name); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("the file was left: %v", err)
	}
	if _, err := Hold(filepath.Join(name, "nowhere")); err == nil || errors.Is(err, ErrLocked) {
		t.Errorf("a folder that is not there: %v", err)
	}
}
