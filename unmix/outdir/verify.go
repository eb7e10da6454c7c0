package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"time"
)

// A Report says whether results can be trusted. The lists hold paths as the
// provenance has them, in its order.
type Report struct {
	Dir        string // where the results lie: in dir.previous after an interrupted swap
	Provenance Provenance

	Missing []string // outputs that are gone
	Changed []string // outputs that are no longer what was written
	Extra   []string // files that no run wrote

	InputsChanged []string
	InputsMissing []string

	// Running is set while another run is writing new results; Pid is its process
	// number, 0 where that cannot be told.
	Running bool
	Pid     int
	// Interrupted says what a run that was killed left, and the remedy; "" if nothing.
	Interrupted string
}

// Whole reports whether every output is there as it was written.
func (r Report) Whole() bool { return len(r.Missing)+len(r.Changed) == 0 }

// InputsEqual reports whether every input is there as it was read.
func (r Report) InputsEqual() bool { return len(r.InputsChanged)+len(r.InputsMissing) == 0 }

// Verify compares the results in dir and the inputs in the folder above it, the
// survey folder, with what provenance.json says of them. It changes nothing.
//
// The error is an *Error of kind ErrNotOurs where dir holds something else, and
// wraps fs.ErrNotExist where it holds nothing.
func Verify(dir string) (Report, error) {
	p, err := locate(dir)
	if err != nil {
		return Report{}, err
	}
	return VerifyWith(dir, filepath.Dir(p.dir))
}

// VerifyWith is Verify for results that do not lie in their survey folder.
func VerifyWith(dir, survey string) (Report, error) {
	p, err := locate(dir)
	if err != nil {
		return Report{}, err
	}
	for try := range 5 {
		var r Report
		before, _ := os.Stat(p.dir)
		r, err = p.verify(survey)
		after, _ := os.Stat(p.dir)
		same := before == nil && after == nil || before != nil && after != nil && os.SameFile(before, after)
		beginning := r.Interrupted != "" && try == 0 // or ending: what looks left by a killed run is looked at twice
		if (err == nil && r.Whole() || !r.Running && same) && !beginning {
			return r, err
		}
		time.Sleep(20 * time.Millisecond) // a run may have been swapping, or has removed what was read
	}
	return p.verify(survey)
}

func (p places) verify(survey string) (Report, error) {
	r := Report{Dir: p.dir}
	r.Pid, r.Running = p.running()
	swapping := exists(p.swapping) && !exists(p.dir)
	switch {
	case swapping:
		r.Dir = p.previous
		if !r.Running {
			r.Interrupted = fmt.Sprintf("a run was killed while new results took the place of the old ones; "+
				"the old ones are in %s: the next run puts them back, or rename the folder to %s", p.previous, filepath.Base(p.dir))
		}
	case exists(p.work) && !r.Running:
		r.Interrupted = fmt.Sprintf("a run was killed; what it left is in %s: the next run tidies it up", p.work)
	}
	if st, err := stateOf(r.Dir); err != nil {
		return r, err
	} else if st != ours {
		return r, fmt.Errorf("%s: no results here (%w); make them with: tarnlight run", r.Dir, fs.ErrNotExist)
	}
	if err := r.outputs(); err != nil {
		return r, err
	}
	r.inputs(survey)
	return r, nil
}

// outputs reads the folder through one handle: a run that swaps meanwhile
// cannot mix what is read, and no name leads out of it.
func (r *Report) outputs() error {
	root, err := os.OpenRoot(r.Dir)
	if err != nil {
		return err
	}
	defer root.Close()
	d, err := readDocument(root.FS())
	if err != nil {
		return fmt.Errorf("%s: %w", r.Dir, err)
	}
	r.Provenance = d.Provenance
	known := map[string]bool{provenanceFile: true}
	for _, want := range d.Outputs {
		known[want.Path] = true
		switch same, err := sameFile(root, want); {
		case errors.Is(err, fs.ErrNotExist):
			r.Missing = append(r.Missing, want.Path)
		case err != nil || !same:
			r.Changed = append(r.Changed, want.Path)
		}
	}
	r.Extra, err = extra(root.FS(), known)
	return err
}

// sameFile reports whether an output is what it was, without following a link.
func sameFile(root *os.Root, want File) (bool, error) {
	fi, err := root.Lstat(want.Path)
	if err != nil {
		return false, err
	}
	if !fi.Mode().IsRegular() || fi.Size() != want.Size {
		return false, nil
	}
	f, err := root.Open(want.Path)
	if err != nil {
		return false, err
	}
	defer f.Close()
	got, err := hash(f)
	return got.SHA256 == want.SHA256, err
}

// extra lists the files of a results folder that are not known, in order.
func extra(fsys fs.FS, known map[string]bool) ([]string, error) {
	var names []string
	err := fs.WalkDir(fsys, ".", func(name string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() && !known[name] && !isLitter(path.Base(name)) {
			names = append(names, name)
		}
		return err
	})
	return names, err
}

func (r *Report) inputs(survey string) {
	for _, want := range r.Provenance.Inputs {
		name := filepath.Join(survey, filepath.FromSlash(want.Path))
		if fi, err := os.Stat(name); errors.Is(err, fs.ErrNotExist) {
			r.InputsMissing = append(r.InputsMissing, want.Path)
			continue
		} else if err != nil || fi.Size() != want.Size {
			r.InputsChanged = append(r.InputsChanged, want.Path)
			continue
		}
		if got, err := HashFile(name); err != nil || got.SHA256 != want.SHA256 {
			r.InputsChanged = append(r.InputsChanged, want.Path)
		}
	}
}

// Lines puts the report into words, one finding a line; the first says whether
// the results are whole, the second how the inputs are.
func (r Report) Lines() []string {
	n, inputs := len(r.Provenance.Outputs), len(r.Provenance.Inputs)
	var lines []string
	if r.Whole() {
		lines = append(lines, fmt.Sprintf("results whole: %s as they were written", files(n)))
	} else {
		lines = append(lines, fmt.Sprintf("results not whole: %d of %d files gone, %d changed; run again", len(r.Missing), n, len(r.Changed)))
	}
	switch gone, changed := len(r.InputsMissing), len(r.InputsChanged); {
	case r.InputsEqual():
		lines = append(lines, fmt.Sprintf("inputs there and equal: %s", files(inputs)))
	case changed == 0:
		lines = append(lines, fmt.Sprintf("inputs gone: %d of %d files, the others equal", gone, inputs))
	default:
		lines = append(lines, fmt.Sprintf("inputs changed: %d of %d files, %d gone; run again", changed, inputs, gone))
	}
	for _, l := range []struct {
		names []string
		what  string
	}{
		{r.Missing, "result gone"},
		{r.Changed, "result changed since it was written"},
		{r.Extra, "not written by a run, and lost when the results after the next ones come"},
		{r.InputsMissing, "input gone"},
		{r.InputsChanged, "input changed since it was read"},
	} {
		for _, name := range l.names {
			lines = append(lines, name+": "+l.what)
		}
	}
	if r.Running {
		lines = append(lines, strings.TrimSuffix(fmt.Sprintf("a run is writing new results: process %d", r.Pid), ": process 0"))
	}
	if r.Interrupted != "" {
		lines = append(lines, r.Interrupted)
	}
	return lines
}

// Edited lists the files in the results folder that somebody has added, or
// changed since they were written, for a warning before Commit: they go to
// dir.previous with the rest and are gone with the Commit after. Only files
// younger than the provenance are read.
func (s *Staging) Edited() []string {
	root, err := os.OpenRoot(s.dir)
	if err != nil {
		return nil // absent
	}
	defer root.Close()
	d, err := readDocument(root.FS())
	if err != nil {
		return nil // empty
	}
	written, err := root.Stat(provenanceFile)
	if err != nil {
		return nil
	}
	known := map[string]bool{provenanceFile: true}
	var names []string
	for _, want := range d.Outputs {
		known[want.Path] = true
		fi, err := root.Lstat(want.Path)
		if err != nil || !fi.ModTime().After(written.ModTime()) && fi.Size() == want.Size {
			continue
		}
		if same, err := sameFile(root, want); err != nil || !same {
			names = append(names, want.Path)
		}
	}
	added, err := extra(root.FS(), known)
	if err != nil {
		added = nil
	}
	names = append(names, added...)
	slices.Sort(names)
	return names
}

// files counts files in words.
func files(n int) string {
	if n == 1 {
		return "1 file"
	}
	return fmt.Sprintf("%d files", n)
}
