package main

import (
	"archive/zip"
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"tarnlight/eem/testkit"

	"github.com/xuri/excelize/v2"
)

// memoryOf runs the program in a process of its own and returns the most memory that it
// held, MB, as the kernel counted it.
func memoryOf(t *testing.T, args ...string) (result, int) {
	t.Helper()
	p := command(t, args...)
	if err := p.Start(); err != nil {
		t.Fatal(err)
	}
	most := make(chan int)
	stop := make(chan bool)
	go func() {
		kb := 0
		for {
			kb = max(kb, highWater(p.Process.Pid))
			select {
			case <-stop:
				most <- kb >> 10
				return
			case <-time.After(2 * time.Millisecond):
			}
		}
	}()
	r := p.result(t)
	close(stop)
	return r, <-most
}

// highWater reads VmHWM of a process, kB; 0 once it is gone. What wait reports will
// not do: it counts the process that started this one.
func highWater(pid int) int {
	b, err := os.ReadFile(fmt.Sprintf("/proc/%d/status", pid))
	if err != nil {
		return 0
	}
	_, rest, _ := strings.Cut(string(b), "VmHWM:")
	kb, err := strconv.Atoi(strings.TrimSpace(strings.SplitN(rest, "kB", 2)[0]))
	if err != nil {
		return 0
	}
	return kb
}

// sparse makes a file of zeros that takes no room.
func sparse(t *testing.T, dir, name string, size int64) {
	t.Helper()
	put(t, dir, name, "")
	if err := os.Truncate(filepath.Join(dir, name), size); err != nil {
		t.Skipf("no sparse files here: %v", err)
	}
}

// bomb is a small run sheet that unpacks to 200 MB.
func bomb(t *testing.T) string {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close()
	if err := f.SetSheetRow("Sheet1", "A1", &[]any{"id", "kind", "scans"}); err != nil {
		t.Fatal(err)
	}
	plain, err := f.WriteToBuffer()
	if err != nil {
		t.Fatal(err)
	}
	z, err := zip.NewReader(bytes.NewReader(plain.Bytes()), int64(plain.Len()))
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	for _, part := range z.File {
		if part.Name != "xl/worksheets/sheet1.xml" {
			if err := w.Copy(part); err != nil {
				t.Fatal(err)
			}
			continue
		}
		out, err := w.Create(part.Name)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(out, "<worksheet><sheetData>"); err != nil {
			t.Fatal(err)
		}
		row := []byte(strings.Repeat("<row><c><v>1</v></c></row>", 1<<16))
		for n := 0; n < 200<<20; n += len(row) {
			if _, err := out.Write(row); err != nil {
				t.Fatal(err)
			}
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// Files that no survey holds: each is named with what is wrong, and costs little more
// memory than a run without it. 2 GB of zeros in every place where a file is read, a
// small run sheet that unpacks to 200 MB, a million columns.
func TestBoundedMemory(t *testing.T) {
	testkit.Heavy(t)
	million := "id" + strings.Repeat(",x", 1_000_000) + "\n"
	var head strings.Builder
	head.WriteString("em_nm\\ex_nm")
	for i := range 1_000_000 {
		fmt.Fprintf(&head, ",%d", 200+i)
	}
	wide := head.String()
	plain := newTiny().write(t)
	_, base := memoryOf(t, "run", plain, "--pictures=false")
	huge := func(name, settings string) func(t *testing.T, y *tiny) string {
		return func(t *testing.T, y *tiny) string {
			y.settings += settings
			dir := y.write(t)
			sparse(t, dir, name, 2<<30)
			return dir
		}
	}
	for _, c := range []struct {
		name string
		make func(t *testing.T, y *tiny) string
		args []string // after the survey folder
		code int
		word string
		room int // MB above a plain run
	}{
		{"scan", huge("scans/W1.csv", ""), nil, exitDoubt, "scans/W1.csv: larger than 256 MB", 60},
		{"scan that no row names", huge("scans/more.csv", ""), nil, exitDone, "scans/more.csv", 60},
		{"run sheet", huge("runsheet.csv", ""), nil, exitFailed, "runsheet.csv: larger than 256 MB", 60},
		{"settings", huge("survey.toml", ""), nil, exitFailed, "survey.toml: 2147483648 bytes are too many", 60},
		{"limits", huge("l.csv", "[quantify]\nlimits = \"l.csv\"\n"), nil, exitFailed, "l.csv: larger than 256 MB", 60},
		{"exclusions", huge("x.csv", ""), []string{"--exclusions", "x.csv"}, exitFailed, "x.csv: larger than 256 MB", 60},
		{"zip bomb", func(t *testing.T, y *tiny) string {
			dir := y.write(t)
			put(t, dir, "runsheet.xlsx", bomb(t))
			if err := os.Remove(filepath.Join(dir, "runsheet.csv")); err != nil {
				t.Fatal(err)
			}
			return dir
		}, nil, exitFailed, "runsheet.xlsx: unpacks to more than 64 MB", 300},
		{"a million columns", func(t *testing.T, y *tiny) string {
			dir := y.write(t)
			put(t, dir, "runsheet.csv", million+million)
			return dir
		}, nil, exitFailed, "runsheet.csv:1: more than 5000 columns", 300},
		{"a million excitations", func(_ *testing.T, y *tiny) string {
			y.files["scans/W1.csv"] = wide + "\n" + strings.Repeat("300"+strings.Repeat(",1", 1_000_000)+"\n", 2)
			return y.write(t)
		}, nil, exitDoubt, "scans/W1.csv", 300},
	} {
		t.Run(c.name, func(t *testing.T) {
			y := newTiny()
			dir := c.make(t, y)
			args := append([]string{"run", dir, "--pictures=false"}, c.args...)
			if len(c.args) > 0 {
				args[len(args)-1] = filepath.Join(dir, c.args[1])
			}
			r, mb := memoryOf(t, args...)
			r.want(t, c.code)
			text := r.err
			if c.code != exitFailed {
				text += read(t, dir, "out", "flags.csv")
			}
			if !strings.Contains(text, c.word) {
				t.Errorf("no %q in %s", c.word, text)
			}
			if mb > base+c.room {
				t.Errorf("%d MB, a plain run holds %d", mb, base)
			}
			t.Logf("%d MB, a plain run %d", mb, base)
		})
	}
	t.Run("begin", func(t *testing.T) {
		dir := folder(t, map[string]string{"W1.csv": gridText(1, 1), "wide.csv": wide})
		sparse(t, dir, "W2.csv", 2<<30)
		sparse(t, dir, "W3.csv", 200<<20) // small enough to be looked into
		r, mb := memoryOf(t, "begin", dir)
		r.want(t, exitDone)
		for _, w := range []string{"W2.csv", "larger than 256 MB", "W3.csv"} {
			if !strings.Contains(r.err, w) {
				t.Errorf("no %q in %s", w, r.err)
			}
		}
		if mb > base+500 {
			t.Errorf("%d MB, a plain run holds %d", mb, base)
		}
		t.Logf("%d MB, a plain run %d", mb, base)
	})
	t.Run("model", func(t *testing.T) {
		dir := newTiny().write(t)
		sparse(t, dir, "model.json", 2<<30)
		r, mb := memoryOf(t, "apply", filepath.Join(dir, "model.json"), dir)
		if r.want(t, exitFailed); !strings.Contains(r.err, "model.json: larger than 256 MB") || mb > base+60 {
			t.Errorf("%d MB: %s", mb, r.err)
		}
	})
}

// fullDisk mounts a small file system, which only root can, and leaves a little room
// on it.
func fullDisk(t *testing.T) (dir string, fill func()) {
	t.Helper()
	dir = t.TempDir()
	if err := syscall.Mount("tmpfs", dir, "tmpfs", 0, "size=8m"); err != nil {
		t.Skipf("no small file system can be mounted here (%v), so that a full disk cannot be made", err)
	}
	t.Cleanup(func() {
		if err := syscall.Unmount(dir, 0); err != nil {
			t.Error(err)
		}
	})
	return dir, func() {
		var s syscall.Statfs_t
		if err := syscall.Statfs(dir, &s); err != nil {
			t.Fatal(err)
		}
		put(t, dir, "filler", strings.Repeat("x", int(s.Bfree)*int(s.Bsize)-32<<10))
	}
}

// A disk that fills up while results are written: exit 1, the message says so and
// what to do, older results are whole, and nothing half-written is left.
func TestDiskFull(t *testing.T) {
	disk, fill := fullDisk(t)
	dir := newTiny().write(t)
	out := filepath.Join(disk, "out")
	runNoPictures(t, dir, "--out", out)
	fill()
	before := tree(t, out)
	r := call("run", dir, "--out", out).want(t, exitFailed)
	for _, w := range []string{"no space left on device", "the disk is full", "--out"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in %s", w, r.err)
		}
	}
	sameTree(t, "full disk", before, tree(t, out))
	if _, err := os.Stat(out + ".work"); err == nil {
		t.Error("out.work was left")
	}
	if r := call("verify", out); r.code == exitFailed {
		t.Errorf("verify: %s", r.out)
	}

	put(t, disk, "s/survey.toml", "[sheet]\nname = \"{id}\"\n")
	put(t, disk, "s/W1.csv", gridText(1, 1))
	put(t, disk, "s/runsheet.csv", "id,kind,scans\nA1,sample,A1.csv\n")
	old(t, filepath.Join(disk, "s"))
	var s syscall.Statfs_t
	if err := syscall.Statfs(disk, &s); err != nil {
		t.Fatal(err)
	}
	put(t, disk, "filler2", strings.Repeat("x", int(s.Bfree)*int(s.Bsize)))
	before = tree(t, filepath.Join(disk, "s"))
	if r := call("begin", filepath.Join(disk, "s"), "--add").want(t, exitFailed); !strings.Contains(r.err, "no space left") {
		t.Errorf("begin: %s", r.err)
	}
	after := tree(t, filepath.Join(disk, "s"))
	sameTree(t, "begin on a full disk", before, after)
}

// asNobody runs the program as a user who owns nothing; for root every folder is
// writable.
func asNobody(t *testing.T, args ...string) result {
	t.Helper()
	p := command(t, args...)
	if os.Geteuid() == 0 {
		exe := filepath.Join(openTemp(t), "tarnlight")
		in, err := os.ReadFile(p.Path)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(exe, in, 0o755); err != nil {
			t.Fatal(err)
		}
		p.Path = exe
		p.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}}
	}
	return p.result(t)
}

// openTemp is a temporary folder that every user may look into.
func openTemp(t *testing.T) string {
	t.Helper()
	dir, err := os.MkdirTemp("", "tarnlight")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := os.RemoveAll(dir); err != nil {
			t.Error(err)
		}
	})
	if err := os.Chmod(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	return dir
}

// A survey on a share that may only be read: run says so before it computes, and what
// to do; with --out elsewhere the job is done. begin --add says so too.
func TestReadOnlySurvey(t *testing.T) {
	testkit.Heavy(t)
	dir := filepath.Join(openTemp(t), "survey")
	y := newTiny()
	for name, text := range y.files {
		put(t, dir, name, text)
	}
	put(t, dir, "runsheet.csv", strings.Join(y.sheet, "\n")+"\n")
	put(t, dir, "survey.toml", y.settings+"[sheet]\nname = \"{id}\"\n")
	runNoPictures(t, dir)
	for _, d := range []string{dir, filepath.Join(dir, "scans")} {
		if err := os.Chmod(d, 0o555); err != nil {
			t.Fatal(err)
		}
	}
	t.Cleanup(func() {
		if err := os.Chmod(dir, 0o755); err != nil {
			t.Error(err)
		}
		if err := os.Chmod(filepath.Join(dir, "scans"), 0o755); err != nil {
			t.Error(err)
		}
	})
	before := tree(t, dir)
	r := asNobody(t, "run", dir).want(t, exitFailed)
	for _, w := range []string{"results cannot be written here", "permission denied", "choose another with --out"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in %s", w, r.err)
		}
	}
	if r := asNobody(t, "begin", dir, "--add").want(t, exitFailed); !strings.Contains(r.err, "permission denied") || !strings.Contains(r.err, dir) {
		t.Errorf("begin: %s", r.err)
	}
	elsewhere := filepath.Join(openTemp(t), "for all")
	if err := os.Mkdir(elsewhere, 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(elsewhere, 0o777); err != nil {
		t.Fatal(err)
	}
	asNobody(t, "run", dir, "--pictures=false", "--out", filepath.Join(elsewhere, "out")).want(t, exitDone, exitDoubt)
	asNobody(t, "verify", filepath.Join(dir, "out")).want(t, exitDone)
	sameTree(t, "read only", before, tree(t, dir))
}
