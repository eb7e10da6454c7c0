// Package outdir replaces a folder of results as one piece: there are the old
// results or the new ones, never a mixture, at whatever moment the program is
// killed. It locks the folder, stages new files beside it, hashes them, and
// swaps. It knows nothing of what the files hold.
//
// Beside a folder out lie
//
//	out.previous  the results before these, kept until the next Commit
//	out.work      while a run is under way: its lock, and in new/ its files
//
// and out.cache, which belongs to those who read and is not touched here; nothing
// else. Siblings names them to whoever walks the folder above.
package outdir

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"time"
)

// The kinds of Error, for errors.Is.
var (
	ErrNotOurs       = errors.New("not a folder of results")
	ErrLocked        = errors.New("in use by another run")
	ErrOpenElsewhere = errors.New("open in another program")
)

// An Error names the file or folder that is in the way and what to do about it.
type Error struct {
	Kind error // ErrNotOurs, ErrLocked, ErrOpenElsewhere
	Path string
	Msg  string // what is the matter, and the remedy
}

func (e *Error) Error() string { return e.Path + ": " + e.Msg }
func (e *Error) Unwrap() error { return e.Kind }

// places are the folders and files that one folder of results needs.
type places struct {
	dir, previous, work string
	lock, fresh, old    string // in work
	swapping            string // a file in work: the swap has begun
}

// locate does not follow a symbolic link above dir; dir itself may be one, and
// then what it points to is replaced.
func locate(dir string) (places, error) {
	dir = filepath.Clean(dir)
	if b := filepath.Base(dir); b == "." || b == ".." {
		abs, err := filepath.Abs(dir)
		if err != nil {
			return places{}, err
		}
		dir = abs
	}
	if fi, err := os.Lstat(dir); err == nil && fi.Mode()&fs.ModeSymlink != 0 {
		if dir, err = filepath.EvalSymlinks(dir); err != nil {
			return places{}, err
		}
	}
	work := dir + ".work"
	return places{
		dir: dir, previous: dir + ".previous", work: work,
		lock:     filepath.Join(work, "lock"),
		fresh:    filepath.Join(work, "new"),
		old:      filepath.Join(work, "old"),
		swapping: filepath.Join(work, "swapping"),
	}, nil
}

// Siblings returns the folders that belong to the results in dir, dir itself
// included, whether they are there or not.
func Siblings(dir string) []string {
	dir = filepath.Clean(dir)
	return []string{dir, dir + ".previous", dir + ".work", dir + ".cache"}
}

// A Staging takes the files of one run. Its methods may be called from several
// goroutines, Commit and Abort once all files are closed.
type Staging struct {
	places
	held *os.File

	mu   sync.Mutex
	err  error // the first that Path met
	done bool

	step func(string) error // called before each change of Commit; tests fail or die there
}

// Begin makes sure that the results in dir can be replaced, locks them against
// other runs and opens an empty staging folder. The folder above dir must exist.
// dir may be absent, empty, or hold results of an earlier Commit; a lock whose
// owner is gone counts for nothing, and what an interrupted run left is put in
// order. After an error nothing has been touched.
//
// The error is an *Error of kind ErrNotOurs where anything else lies in dir or
// in the way of a sibling, ErrLocked where another run is at work, and
// ErrOpenElsewhere where another program has one of the files open.
func Begin(dir string) (*Staging, error) {
	p, err := locate(dir)
	if err != nil {
		return nil, err
	}
	if err := p.checkUnlocked(); err != nil {
		return nil, err
	}
	s := &Staging{places: p, step: func(string) error { return nil }}
	if s.held, err = acquire(p); err != nil {
		return nil, err
	}
	if err := s.open(); err != nil {
		return nil, errors.Join(err, p.release(s.held))
	}
	return s, nil
}

// open does what needs the lock.
func (s *Staging) open() error {
	if err := s.repair(); err != nil {
		return err
	}
	if err := s.check(); err != nil { // again: another run may have ended in between
		return err
	}
	return os.Mkdir(s.fresh, 0o777)
}

// checkUnlocked is check before the lock is ours. What another run is just doing may
// look like folders of somebody else: where one is at work, or was while we looked,
// the check under the lock decides.
func (p places) checkUnlocked() error {
	var err error
	for range 3 { // runs as short as a look
		before := isLocked(p.lock)
		if err = p.check(); err == nil || before || isLocked(p.lock) {
			return nil
		}
		time.Sleep(time.Millisecond)
	}
	return err
}

// check reports what stands in the way of replacing dir; it changes nothing.
func (p places) check() error {
	above := filepath.Dir(p.dir)
	if fi, err := os.Stat(above); err != nil {
		return fmt.Errorf("%w; make the folder first", err)
	} else if !fi.IsDir() {
		return &Error{ErrNotOurs, above, "is no folder; choose another place for the results"}
	}
	for _, dir := range []string{p.dir, p.previous} {
		if _, err := stateOf(dir); err != nil {
			return err
		}
	}
	if err := p.checkWork(); err != nil {
		return err
	}
	if err := replaceable(p.dir); err != nil {
		return err
	}
	return p.openElsewhere()
}

// checkWork refuses a folder named like our work folder that has no lock in it.
func (p places) checkWork() error {
	list, err := os.ReadDir(p.work)
	if errors.Is(err, fs.ErrNotExist) || err == nil && len(list) == 0 {
		return nil
	}
	if err == nil {
		if _, err = os.Lstat(p.lock); err == nil {
			return nil
		}
	}
	if _, gone := os.Lstat(p.work); errors.Is(gone, fs.ErrNotExist) {
		return nil // another run has just ended
	}
	return &Error{ErrNotOurs, p.work, "is needed while results are written, but holds something else; move it away"}
}

// A state is what lies where results are to lie.
type state int

const (
	absent state = iota
	empty
	ours
)

// stateOf returns an *Error of kind ErrNotOurs where something else lies there.
func stateOf(dir string) (state, error) {
	fi, err := os.Stat(dir)
	if errors.Is(err, fs.ErrNotExist) {
		return absent, nil
	}
	if err != nil {
		return absent, err
	}
	if !fi.IsDir() {
		return absent, &Error{ErrNotOurs, dir, "is a file; results need a folder of their own: choose another with --out"}
	}
	list, err := os.ReadDir(dir)
	if err != nil {
		return absent, err
	}
	if len(list) == 0 {
		return empty, nil
	}
	if _, err := readDocument(os.DirFS(dir)); err != nil {
		return absent, &Error{ErrNotOurs, dir,
			fmt.Sprintf("holds files, but no results of an earlier run (%v); move it away or choose another folder with --out", err)}
	}
	return ours, nil
}

// Path returns where to write the output name, a slash-separated path below the
// results folder, and makes the folders above it. If they cannot be made the
// file cannot be made either; Commit returns why.
//
// It panics if name is not local, holds a backslash or colon, or is the name of
// the provenance file.
func (s *Staging) Path(name string) string {
	if !fs.ValidPath(name) || name == "." || name == provenanceFile || strings.ContainsAny(name, `\:`) ||
		!filepath.IsLocal(filepath.FromSlash(name)) {
		panic(fmt.Sprintf("outdir: %q is not the name of an output", name))
	}
	path := filepath.Join(s.fresh, filepath.FromSlash(name))
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		s.mu.Lock()
		defer s.mu.Unlock()
		if s.err == nil {
			s.err = err
		}
	}
	return path
}

// Abort removes the staged files and the lock; the old results stay as they
// are. After Commit or Abort it does nothing, so that it can be deferred.
func (s *Staging) Abort() error {
	if s.done {
		return nil
	}
	s.done = true
	return errors.Join(os.RemoveAll(s.fresh), s.release(s.held))
}
