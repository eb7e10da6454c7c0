package outdir

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"
)

// asNobody runs f with the file rights of a user who owns nothing; for root
// every folder is writable.
func asNobody(t *testing.T, f func()) {
	t.Helper()
	if os.Geteuid() != 0 {
		f()
		return
	}
	runtime.LockOSThread() // the rights are the thread's
	defer runtime.UnlockOSThread()
	set := func(uid uintptr) {
		if _, _, errno := syscall.RawSyscall(syscall.SYS_SETFSUID, uid, 0, 0); errno != 0 {
			t.Fatal(errno)
		}
	}
	set(65534)
	defer set(0)
	f()
}

func TestReadOnlyFolder(t *testing.T) {
	above := t.TempDir()
	dir := filepath.Join(above, "out")
	commit(t, dir, 1)
	for p := above; p != filepath.Dir(os.TempDir()) && os.Geteuid() == 0; p = filepath.Dir(p) {
		if fi, err := os.Stat(p); err == nil && fi.Mode().Perm()&0o005 != 0o005 {
			if err := os.Chmod(p, 0o755); err != nil {
				t.Fatal(err)
			}
		}
	}
	if err := os.Chmod(above, 0o555); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := os.Chmod(above, 0o755); err != nil {
			t.Error(err)
		}
	})
	before := tree(t, above)
	var err error
	asNobody(t, func() { _, err = Begin(dir) })
	if !errors.Is(err, fs.ErrPermission) || !strings.Contains(err.Error(), "out.work") || !strings.Contains(err.Error(), "--out") {
		t.Errorf("error %v", err)
	}
	if after := tree(t, above); after != before {
		t.Errorf("before:\n%s\nafter:\n%s", before, after)
	}
}

// small mounts a file system of 64 kB, which only root can.
func small(t *testing.T, dir string) {
	t.Helper()
	if err := os.MkdirAll(dir, 0o777); err != nil {
		t.Fatal(err)
	}
	if err := syscall.Mount("tmpfs", dir, "tmpfs", 0, "size=64k"); err != nil {
		t.Skipf("no file system can be mounted here: %v", err)
	}
	t.Cleanup(func() {
		if err := syscall.Unmount(dir, 0); err != nil {
			t.Error(err)
		}
	})
}

func TestDiskFull(t *testing.T) {
	above := t.TempDir()
	small(t, above)
	dir := filepath.Join(above, "out")
	commit(t, dir, 1)
	before := tree(t, above)
	s := begin(t, dir)
	err := os.WriteFile(s.Path("full"), make([]byte, 1<<20), 0o666)
	if !errors.Is(err, syscall.ENOSPC) {
		t.Fatalf("error %v", err)
	}
	// A run that overlooked it cannot commit, for want of room for the provenance.
	if err := s.Commit(Provenance{Version: "2"}); !errors.Is(err, syscall.ENOSPC) {
		t.Errorf("error %v", err)
	}
	if err := s.Abort(); err != nil {
		t.Error(err)
	}
	if after := tree(t, above); after != before {
		t.Errorf("before:\n%s\nafter:\n%s", before, after)
	}
}

func TestMountPoint(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	small(t, dir)
	if _, err := Begin(dir); !errors.Is(err, ErrNotOurs) || !strings.Contains(err.Error(), "mount point") {
		t.Errorf("error %v", err)
	}
	commit(t, filepath.Join(dir, "results"), 1)
}

func TestHashFileOfPipe(t *testing.T) {
	path := filepath.Join(t.TempDir(), "S1.csv")
	if err := syscall.Mkfifo(path, 0o666); err != nil {
		t.Skip(err)
	}
	if _, err := HashFile(path); err == nil { // and it does not wait for a writer
		t.Error("a pipe has a hash")
	}
}
