package outdir

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// survey makes a survey folder with two inputs, one of them outside it, and
// results made from them.
func survey(t *testing.T, above string) (root, out string) {
	t.Helper()
	root = filepath.Join(above, "survey")
	out = filepath.Join(root, "out")
	write(t, filepath.Join(root, "scans", "S1.csv"), "abc")
	write(t, filepath.Join(above, "lamp.csv"), "nm")
	s := begin(t, out)
	write(t, s.Path("a.csv"), "a")
	write(t, s.Path("maps/b.csv"), "b")
	if err := s.Commit(made(t, root)); err != nil {
		t.Fatal(err)
	}
	return root, out
}

func made(t *testing.T, root string) Provenance {
	t.Helper()
	p := Provenance{Version: "1.2", Verb: "run", Steps: []string{"offset", "blank"}}
	for _, name := range []string{"scans/S1.csv", "../lamp.csv", "scans/S1.csv"} {
		f, err := HashUnder(root, filepath.Join(root, name))
		if err != nil {
			t.Fatal(err)
		}
		p.Inputs = append(p.Inputs, f)
	}
	return p
}

// The hash of "abc" is the first example of FIPS 180-4 (NIST's worked examples).
func TestHashFile(t *testing.T) {
	path := filepath.Join(t.TempDir(), "S1.csv")
	write(t, path, "abc")
	got, err := HashFile(path)
	want := File{filepath.ToSlash(path), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad", 3}
	if err != nil || got != want {
		t.Errorf("%+v %v, want %+v", got, err, want)
	}
	if _, err := HashFile(filepath.Dir(path)); err == nil {
		t.Error("a folder has a hash")
	}
	if _, err := HashFile(path + "x"); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("error %v", err)
	}
}

// The layout of the file (hashes from sha256sum of GNU coreutils), and that neither the place nor the time nor the order
// of inputs changes a byte.
func TestProvenanceBytes(t *testing.T) {
	_, out := survey(t, t.TempDir())
	got, err := os.ReadFile(filepath.Join(out, provenanceFile))
	if err != nil {
		t.Fatal(err)
	}
	want := `{
	"program": "tarnlight",
	"format": 1,
	"version": "1.2",
	"platform": "` + runtime.GOOS + "/" + runtime.GOARCH + `",
	"go": "` + runtime.Version() + `",
	"verb": "run",
	"steps": [
		"offset",
		"blank"
	],
	"inputs": [
		{
			"path": "../lamp.csv",
			"sha256": "2ca7289b5248632c8fe5386b972e8fde6585068c5cb8e2948489e10e7be6d4d8",
			"size": 2
		},
		{
			"path": "scans/S1.csv",
			"sha256": "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad",
			"size": 3
		}
	],
	"outputs": [
		{
			"path": "a.csv",
			"sha256": "ca978112ca1bbdcafac231b39a23dc4da786eff8147c4e72b9807785afee48bb",
			"size": 1
		},
		{
			"path": "maps/b.csv",
			"sha256": "3e23e8160039594a33894f6564e1b1348bbd7a0088d42c4acb73eeaed59c009d",
			"size": 1
		}
	]
}
`
	if diff := cmp.Diff(want, string(got)); diff != "" {
		t.Error(diff)
	}
	time.Sleep(10 * time.Millisecond)
	_, again := survey(t, t.TempDir())
	if b, err := os.ReadFile(filepath.Join(again, provenanceFile)); err != nil || !bytes.Equal(b, got) {
		t.Errorf("made again: %s %v", b, err)
	}
	p, err := ReadProvenance(out)
	if err != nil || p.Version != "1.2" || len(p.Outputs) != 2 {
		t.Errorf("%+v %v", p, err)
	}
}

func TestProvenanceRefuses(t *testing.T) {
	s := begin(t, filepath.Join(t.TempDir(), "out"))
	err := s.Commit(Provenance{Inputs: []File{{"S1.csv", "01", 3}, {"S1.csv", "02", 3}}})
	if err == nil || !strings.Contains(err.Error(), "S1.csv: changed while it was being read") {
		t.Errorf("error %v", err)
	}
	defer func() {
		if recover() == nil {
			t.Error("an absolute input path did not panic")
		}
	}()
	_ = s.Commit(Provenance{Inputs: []File{{"/home/S1.csv", "01", 3}}})
}

func TestVerify(t *testing.T) {
	for _, c := range []struct {
		name   string
		damage func(root, out string) error
		want   Report
		lines  []string
	}{
		{"nothing", func(string, string) error { return nil }, Report{},
			[]string{"results whole: 2 files as they were written", "inputs there and equal: 2 files"}},
		{"result gone", func(_, out string) error { return os.Remove(filepath.Join(out, "a.csv")) },
			Report{Missing: []string{"a.csv"}},
			[]string{"results not whole: 1 of 2 files gone, 0 changed; run again", "inputs there and equal: 2 files", "a.csv: result gone"}},
		{"result of the same size", func(_, out string) error { return os.WriteFile(filepath.Join(out, "maps/b.csv"), []byte("c"), 0o666) },
			Report{Changed: []string{"maps/b.csv"}}, nil},
		{"result longer", func(_, out string) error { return os.WriteFile(filepath.Join(out, "a.csv"), []byte("aa"), 0o666) },
			Report{Changed: []string{"a.csv"}}, nil},
		{"result now a folder", func(_, out string) error {
			return errors.Join(os.Remove(filepath.Join(out, "a.csv")), os.Mkdir(filepath.Join(out, "a.csv"), 0o777))
		}, Report{Changed: []string{"a.csv"}}, nil},
		{"result now a link to its like", func(_, out string) error {
			return errors.Join(os.Rename(filepath.Join(out, "a.csv"), filepath.Join(out, "b")), os.Symlink("b", filepath.Join(out, "a.csv")))
		}, Report{Changed: []string{"a.csv"}, Extra: []string{"b"}}, nil},
		{"more files", func(_, out string) error {
			return errors.Join(os.WriteFile(filepath.Join(out, "maps/z"), nil, 0o666), os.WriteFile(filepath.Join(out, ".DS_Store"), nil, 0o666))
		}, Report{Extra: []string{"maps/z"}}, nil},
		{"inputs changed and gone", func(root, _ string) error {
			return errors.Join(os.WriteFile(filepath.Join(root, "scans/S1.csv"), []byte("abd"), 0o666), os.Remove(filepath.Join(root, "../lamp.csv")))
		}, Report{InputsChanged: []string{"scans/S1.csv"}, InputsMissing: []string{"../lamp.csv"}},
			[]string{"results whole: 2 files as they were written", "inputs changed: 1 of 2 files, 1 gone; run again",
				"../lamp.csv: input gone", "scans/S1.csv: input changed since it was read"}},
		{"inputs gone", func(root, _ string) error { return os.RemoveAll(filepath.Join(root, "scans")) },
			Report{InputsMissing: []string{"scans/S1.csv"}},
			[]string{"results whole: 2 files as they were written", "inputs gone: 1 of 2 files, the others equal", "scans/S1.csv: input gone"}},
		{"input longer", func(root, _ string) error {
			return os.WriteFile(filepath.Join(root, "scans/S1.csv"), []byte("abcd"), 0o666)
		}, Report{InputsChanged: []string{"scans/S1.csv"}}, nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			root, out := survey(t, t.TempDir())
			if err := c.damage(root, out); err != nil {
				t.Fatal(err)
			}
			got, err := Verify(out)
			if err != nil {
				t.Fatal(err)
			}
			if len(got.Provenance.Outputs) != 2 || got.Dir != out {
				t.Errorf("%+v", got)
			}
			got.Dir, got.Provenance = "", Provenance{Inputs: got.Provenance.Inputs, Outputs: got.Provenance.Outputs}
			if lines := got.Lines(); c.lines != nil && !slices.Equal(lines, c.lines) {
				t.Errorf("lines:\n%s", strings.Join(lines, "\n"))
			}
			got.Provenance = Provenance{}
			if diff := cmp.Diff(c.want, got); diff != "" {
				t.Error(diff)
			}
			if got.Whole() != (len(c.want.Missing)+len(c.want.Changed) == 0) {
				t.Errorf("Whole is %v", got.Whole())
			}
		})
	}
}

func TestVerifyElsewhere(t *testing.T) {
	root, out := survey(t, t.TempDir())
	moved := filepath.Join(t.TempDir(), "results")
	if err := os.Rename(out, moved); err != nil {
		t.Fatal(err)
	}
	if r, err := Verify(moved); err != nil || !r.Whole() || len(r.InputsMissing) != 2 {
		t.Errorf("%v %v", r.Lines(), err)
	}
	if r, err := VerifyWith(moved, root); err != nil || !r.Whole() || !r.InputsEqual() {
		t.Errorf("%v %v", r.Lines(), err)
	}
}

func TestVerifyNoResults(t *testing.T) {
	above := t.TempDir()
	if _, err := Verify(filepath.Join(above, "out")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("absent: error %v", err)
	}
	if err := os.Mkdir(filepath.Join(above, "out"), 0o777); err != nil {
		t.Fatal(err)
	}
	if _, err := Verify(filepath.Join(above, "out")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("empty: error %v", err)
	}
	write(t, filepath.Join(above, "out", "a"), "")
	if _, err := Verify(filepath.Join(above, "out")); !errors.Is(err, ErrNotOurs) {
		t.Errorf("not ours: error %v", err)
	}
}

// Whatever the provenance file holds: no panic, and no output outside the folder
// is taken for one of ours.
func FuzzVerify(f *testing.F) {
	f.Add([]byte(`{"program": "tarnlight", "format": 1, "outputs": [{"path": "a.csv", "sha256": "ca978112ca1bbdcafac231b39a23dc4da786eff8147c4e72b9807785afee48bb", "size": 1}]}`))
	f.Add([]byte(`{"program": "tarnlight", "outputs": [{"path": "../secret", "size": 1, "sha256": "ca978112ca1bbdcafac231b39a23dc4da786eff8147c4e72b9807785afee48bb"}]}`))
	f.Add([]byte(`{"program": "tarnlight", "outputs": [{"path": "/dev/zero"}], "inputs": [{"path": "/dev/zero"}, {"path": "\u0000"}]}`))
	f.Add([]byte(`{"program": "tarnlight", "format": -1, "inputs": null}`))
	f.Add([]byte(`{"program": 1}`))
	f.Add([]byte(``))
	above := f.TempDir()
	out := filepath.Join(above, "out")
	for name, content := range map[string]string{"a.csv": "a", "../secret": "a"} {
		path := filepath.Join(out, name)
		if err := errors.Join(os.MkdirAll(out, 0o777), os.WriteFile(path, []byte(content), 0o666)); err != nil {
			f.Fatal(err)
		}
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		write(t, filepath.Join(out, provenanceFile), string(b))
		r, err := Verify(out)
		if err != nil {
			if !errors.Is(err, ErrNotOurs) {
				t.Errorf("error %v", err)
			}
			return
		}
		for _, f := range r.Provenance.Outputs {
			if clean := filepath.ToSlash(filepath.Clean(f.Path)); clean == "a.csv" || clean == provenanceFile {
				continue
			}
			if !slices.Contains(r.Missing, f.Path) && !slices.Contains(r.Changed, f.Path) {
				t.Errorf("%q is taken for an output", f.Path)
			}
		}
		_ = r.Lines()
	})
}
