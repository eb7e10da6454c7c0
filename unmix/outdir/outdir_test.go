package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
)

// generation writes and commits results that all hold the number g, so that a
// mixture of two generations shows. One file is below a folder, one exists in
// even generations only.
func generation(s *Staging, g int) error {
	names := []string{"contributions.csv", "maps/S1.png", "maps/deep/S2.png"}
	if g%2 == 0 {
		names = append(names, "even.csv")
	}
	for _, name := range names {
		if err := os.WriteFile(s.Path(name), []byte(strings.Repeat(strconv.Itoa(g)+"\n", 50)), 0o666); err != nil {
			return err
		}
	}
	return s.Commit(Provenance{Version: strconv.Itoa(g)})
}

func commit(t *testing.T, dir string, g int) {
	t.Helper()
	s := begin(t, dir)
	if err := generation(s, g); err != nil {
		t.Fatal(err)
	}
}

func begin(t *testing.T, dir string) *Staging {
	t.Helper()
	s, err := Begin(dir)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := s.Abort(); err != nil {
			t.Error(err)
		}
	})
	return s
}

// generationOf verifies the results in dir and returns their number, having
// looked at every file.
func generationOf(t *testing.T, dir string) int {
	t.Helper()
	r, err := Verify(dir)
	if err != nil {
		t.Fatal(err)
	}
	if !r.Whole() || len(r.Extra) > 0 {
		t.Fatalf("%s: %v", dir, r.Lines())
	}
	g, err := strconv.Atoi(r.Provenance.Version)
	if err != nil {
		t.Fatal(err)
	}
	if want := 4 - g%2; len(r.Provenance.Outputs) != want {
		t.Fatalf("generation %d has %d files, want %d", g, len(r.Provenance.Outputs), want)
	}
	for _, f := range r.Provenance.Outputs {
		b, err := os.ReadFile(filepath.Join(r.Dir, f.Path))
		if err != nil {
			t.Fatal(err)
		}
		if string(b) != strings.Repeat(strconv.Itoa(g)+"\n", 50) {
			t.Fatalf("%s/%s of generation %d holds %.20q", dir, f.Path, g, b)
		}
	}
	return g
}

// tree returns every path below dir with its content, to show that nothing was
// touched.
func tree(t *testing.T, dir string) string {
	t.Helper()
	var b strings.Builder
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		fmt.Fprintln(&b, path, d.Type())
		if d.Type().IsRegular() {
			content, err := os.ReadFile(path)
			fmt.Fprintf(&b, "%q\n", content)
			return err
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func write(t *testing.T, path, content string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(content), 0o666); err != nil {
		t.Fatal(err)
	}
}

func entries(t *testing.T, dir string) []string {
	t.Helper()
	list, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, d := range list {
		names = append(names, d.Name())
	}
	return names
}

func TestGenerationsReplaceOneAnother(t *testing.T) {
	above := t.TempDir()
	dir := filepath.Join(above, "out")
	for g := 1; g <= 4; g++ {
		commit(t, dir, g)
		if got := generationOf(t, dir); got != g {
			t.Errorf("results are generation %d, want %d", got, g)
		}
		want := []string{"out", "out.previous"}
		if g == 1 {
			want = want[:1]
		} else if got := generationOf(t, dir+".previous"); got != g-1 {
			t.Errorf("former results are generation %d, want %d", got, g-1)
		}
		if got := entries(t, above); !slices.Equal(got, want) {
			t.Errorf("after generation %d: %q, want %q", g, got, want)
		}
	}
}

func TestAbortLeavesOldResults(t *testing.T) {
	above := t.TempDir()
	dir := filepath.Join(above, "out")
	commit(t, dir, 1)
	commit(t, dir, 2)
	before := tree(t, above)
	s := begin(t, dir)
	write(t, s.Path("maps/half.png"), "half")
	for range 2 {
		if err := s.Abort(); err != nil {
			t.Fatal(err)
		}
	}
	if after := tree(t, above); after != before {
		t.Errorf("before:\n%s\nafter:\n%s", before, after)
	}
}

func TestEmptyFolderBecomesResults(t *testing.T) {
	above := t.TempDir()
	dir := filepath.Join(above, "out")
	if err := os.Mkdir(dir, 0o777); err != nil {
		t.Fatal(err)
	}
	commit(t, dir, 1)
	if got := entries(t, above); !slices.Equal(got, []string{"out"}) || generationOf(t, dir) != 1 {
		t.Errorf("%q", got)
	}
}

func TestDeletedResultsStayDeleted(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	commit(t, dir, 2)
	if err := os.RemoveAll(dir); err != nil {
		t.Fatal(err)
	}
	if err := begin(t, dir).Abort(); err != nil {
		t.Fatal(err)
	}
	if exists(dir) {
		t.Error("results that were deleted came back")
	}
	commit(t, dir, 3)
	if generationOf(t, dir) != 3 || generationOf(t, dir+".previous") != 1 {
		t.Error("wrong generations")
	}
}

func TestLinkedFolder(t *testing.T) {
	above := t.TempDir()
	dir, link := filepath.Join(above, "store", "out"), filepath.Join(above, "out")
	if err := os.Mkdir(filepath.Dir(dir), 0o777); err != nil {
		t.Fatal(err)
	}
	commit(t, dir, 1)
	if err := os.Symlink(dir, link); err != nil {
		t.Skip(err)
	}
	commit(t, link, 2)
	if fi, err := os.Lstat(link); err != nil || fi.Mode()&fs.ModeSymlink == 0 {
		t.Errorf("the link was replaced: %v %v", fi, err)
	}
	if generationOf(t, link) != 2 || generationOf(t, dir+".previous") != 1 {
		t.Error("wrong generations")
	}
}

// What is not ours is refused with its name, and nothing is touched.
func TestNotOurs(t *testing.T) {
	for _, c := range []struct{ name, path, content, want string }{
		{"a file", "out", "x", "out"},
		{"a folder with a file", "out/notes.txt", "x", "out"},
		{"another program's provenance", "out/provenance.json", `{"program": "other"}`, "out"},
		{"damaged provenance", "out/provenance.json", `{"program": "tarnl`, "out"},
		{"a later version's", "out/provenance.json", `{"program": "tarnlight", "format": 2, "version": "v9"}`, "later version, v9"},
		{"former results", "out.previous/thesis.txt", "x", "out.previous"},
		{"work folder", "out.work/new/thesis.txt", "x", "out.work"},
		{"work file", "out.work", "x", "out.work"},
	} {
		t.Run(c.name, func(t *testing.T) {
			above := t.TempDir()
			write(t, filepath.Join(above, c.path), c.content)
			before := tree(t, above)
			_, err := Begin(filepath.Join(above, "out"))
			if !errors.Is(err, ErrNotOurs) || !strings.Contains(err.Error(), c.want) {
				t.Errorf("error %v, want one of kind ErrNotOurs that names %s", err, c.want)
			}
			var e *Error
			if !errors.As(err, &e) || !strings.HasPrefix(e.Path, above) {
				t.Errorf("error %#v names no path", err)
			}
			if after := tree(t, above); after != before {
				t.Errorf("before:\n%s\nafter:\n%s", before, after)
			}
		})
	}
}

func TestSurveyFolderItselfIsRefused(t *testing.T) {
	above := t.TempDir()
	write(t, filepath.Join(above, "runsheet.csv"), "id,kind\n")
	t.Chdir(above)
	if _, err := Begin("."); !errors.Is(err, ErrNotOurs) {
		t.Errorf("error %v", err)
	}
	if got := entries(t, above); !slices.Equal(got, []string{"runsheet.csv"}) {
		t.Errorf("%q", got)
	}
}

func TestFolderAboveMustExist(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "nowhere", "out")
	if _, err := Begin(dir); !errors.Is(err, fs.ErrNotExist) || !strings.Contains(err.Error(), "nowhere") {
		t.Errorf("error %v", err)
	}
}

func TestPath(t *testing.T) {
	s := begin(t, filepath.Join(t.TempDir(), "out"))
	for _, name := range []string{"a.csv", "maps/a.csv", "a..b", "..a/b", "ä μ.csv"} {
		path := s.Path(name)
		if rel, err := filepath.Rel(s.fresh, path); err != nil || filepath.ToSlash(rel) != name {
			t.Errorf("Path(%q) = %s", name, path)
		}
		if err := os.WriteFile(path, nil, 0o666); err != nil {
			t.Error(err)
		}
	}
	for _, name := range []string{"", ".", "..", "../a", "a/../../b", "a/..", "/a", "a//b", "a/", `a\b`, `..\a`, "C:a", "C:/a", "provenance.json"} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("Path(%q) did not panic", name)
				}
			}()
			s.Path(name)
		}()
	}
}

// A file where a folder has to be: the first error is the one that Commit tells.
func TestPathErrorReachesCommit(t *testing.T) {
	s := begin(t, filepath.Join(t.TempDir(), "out"))
	write(t, s.Path("maps"), "x")
	s.Path("maps/a.png")
	if err := s.Commit(Provenance{}); err == nil || !strings.Contains(err.Error(), "maps") {
		t.Errorf("error %v", err)
	}
}

func TestCommitRefusesLinks(t *testing.T) {
	s := begin(t, filepath.Join(t.TempDir(), "out"))
	if err := os.Symlink("elsewhere", s.Path("a.csv")); err != nil {
		t.Skip(err)
	}
	if err := s.Commit(Provenance{}); err == nil || !strings.Contains(err.Error(), "a.csv: not a regular file") {
		t.Errorf("error %v", err)
	}
}

func TestOpenElsewhere(t *testing.T) {
	for _, c := range []struct{ owner, doc string }{
		{".~lock.report.xlsx#", "report.xlsx"},
		{"~$report.xlsx", "report.xlsx"},
		{"~$port.xlsx", "report.xlsx"},
		{"", ""},
		{"~$other.xlsx", ""}, // left behind by a file that is gone
		{".~lock.other.xlsx#", ""},
		{".~lock.report.xlsx", ""},
		{"~$", ""},
	} {
		t.Run(c.owner, func(t *testing.T) {
			above := t.TempDir()
			dir := filepath.Join(above, "out")
			s := begin(t, dir)
			write(t, s.Path("tables/report.xlsx"), "x")
			if err := s.Commit(Provenance{}); err != nil {
				t.Fatal(err)
			}

			late := begin(t, dir) // before the workbook is opened
			write(t, late.Path("tables/report.xlsx"), "y")
			ownerFile := filepath.Join(dir, "tables", c.owner)
			if c.owner != "" {
				write(t, ownerFile, "somebody")
			}
			before := tree(t, dir)
			err := late.Commit(Provenance{})
			if c.doc == "" {
				if err != nil {
					t.Error(err)
				}
				return
			}
			wantOpen := func(err error) {
				t.Helper()
				var e *Error
				if !errors.Is(err, ErrOpenElsewhere) || !errors.As(err, &e) || e.Path != filepath.Join(dir, "tables", c.doc) ||
					!strings.Contains(e.Msg, c.owner) {
					t.Errorf("error %v", err)
				}
			}
			wantOpen(err)
			if after := tree(t, dir); after != before {
				t.Errorf("before:\n%s\nafter:\n%s", before, after)
			}

			// Closed, the same staging folder can still be committed; a new run is refused while it is open.
			if err := os.Remove(ownerFile); err != nil {
				t.Fatal(err)
			}
			if err := late.Commit(Provenance{Version: "2"}); err != nil {
				t.Fatal(err)
			}
			write(t, ownerFile, "somebody")
			_, err = Begin(dir)
			wantOpen(err)
			if got := entries(t, above); !slices.Equal(got, []string{"out", "out.previous"}) {
				t.Errorf("%q", got)
			}
		})
	}
}

// Every step of Commit fails once: the old results and the ones before stay.
func TestFailedCommitLeavesOldResults(t *testing.T) {
	for _, prior := range []int{0, 1, 2} {
		var steps []string
		for n := 0; ; n++ {
			above := t.TempDir()
			dir := filepath.Join(above, "out")
			for g := 1; g <= prior; g++ {
				commit(t, dir, g)
			}
			before := tree(t, above)
			s := begin(t, dir)
			broken, i := errors.New("broken"), 0
			s.step = func(name string) error {
				if i++; i <= n || name == "swapped" {
					return nil
				}
				steps = append(steps, name)
				return broken
			}
			err := generation(s, 9)
			if err == nil {
				if n < 2 || generationOf(t, dir) != 9 {
					t.Errorf("after %d steps %v", n, steps)
				}
				break
			}
			if !errors.Is(err, broken) {
				t.Fatal(err)
			}
			if err := s.Abort(); err != nil {
				t.Fatal(err)
			}
			if after := tree(t, above); after != before {
				t.Errorf("%d older, %v: before:\n%s\nafter:\n%s", prior, steps, before, after)
			}
		}
		want := []string{"provenance", "new to out"}
		switch prior {
		case 1:
			want = []string{"provenance", "mark", "out to out.previous", "new to out"}
		case 2:
			want = []string{"provenance", "mark", "out.previous to old", "out to out.previous", "new to out"}
		}
		if !slices.Equal(steps, want) {
			t.Errorf("%d older: steps %q, want %q", prior, steps, want)
		}
	}
}

func TestTwoAtOnce(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	s := begin(t, dir)
	write(t, s.Path("a.csv"), "x")
	before := tree(t, filepath.Dir(dir))
	_, err := Begin(dir)
	if !errors.Is(err, ErrLocked) || !strings.Contains(err.Error(), fmt.Sprintf("process %d ", os.Getpid())) {
		t.Errorf("error %v", err)
	}
	if after := tree(t, filepath.Dir(dir)); after != before {
		t.Errorf("before:\n%s\nafter:\n%s", before, after)
	}
	if r, err := Verify(dir); err != nil || !r.Whole() || !r.Running || r.Pid != os.Getpid() {
		t.Errorf("%v %v", r.Lines(), err)
	}
	if err := s.Abort(); err != nil {
		t.Fatal(err)
	}
	commit(t, dir, 2)
}

// Several runs in one folder, one after the other as the lock lets them, and
// somebody who verifies all the time.
func TestManyAtOnce(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	commit(t, dir, 1)
	const runs, rounds = 4, 10
	var wg sync.WaitGroup
	done := make(chan bool)
	for run := range runs {
		wg.Go(func() {
			for round := 0; round < rounds; {
				s, err := Begin(dir)
				if errors.Is(err, ErrLocked) {
					continue
				}
				if err == nil {
					err = generation(s, run*rounds+round)
				}
				if err != nil {
					t.Error(err)
					return
				}
				round++
			}
		})
	}
	go func() { wg.Wait(); close(done) }()
	for running := true; running; {
		select {
		case <-done:
			running = false
		default:
		}
		if r, err := Verify(dir); err != nil || !r.Whole() {
			t.Errorf("%v %v", r.Lines(), err)
		}
	}
	generationOf(t, dir)
	generationOf(t, dir+".previous")
	if got := entries(t, filepath.Dir(dir)); !slices.Equal(got, []string{"out", "out.previous"}) {
		t.Errorf("%q", got)
	}
}

func TestEdited(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	if got := begin(t, dir).Edited(); got != nil {
		t.Errorf("absent: %q", got)
	}
	dir = filepath.Join(t.TempDir(), "out")
	commit(t, dir, 2)
	write(t, filepath.Join(dir, "maps", "S1.png"), "drawn over")
	write(t, filepath.Join(dir, "even.csv"), strings.Repeat("2\n", 50)) // younger, but equal
	write(t, filepath.Join(dir, "a note.txt"), "mine")
	write(t, filepath.Join(dir, "Thumbs.db"), "")
	if got, want := begin(t, dir).Edited(), []string{"a note.txt", "maps/S1.png"}; !slices.Equal(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
}
