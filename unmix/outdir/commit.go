package outdir

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sync"
)

// Commit hashes every staged file, writes the provenance last, makes all of it
// durable, and swaps: the results in dir become dir.previous, whose former
// content is removed, and the staged files become dir. Then the lock is gone.
//
// After an error dir and dir.previous are as they were before. If it is of kind
// ErrOpenElsewhere the staged files are complete, and Commit may be called again
// once the file is closed; in any case Abort gives them up.
//
// It panics after Commit or Abort, and if the path of an input is absolute.
func (s *Staging) Commit(p Provenance) error {
	if s.done {
		panic("outdir: Commit of a staging folder that is gone")
	}
	if s.err != nil {
		return s.err
	}
	if err := s.seal(p); err != nil {
		return err
	}
	if err := s.openElsewhere(); err != nil {
		return err
	}
	if err := s.swap(); err != nil {
		return fmt.Errorf("the new results could not take the place of the old ones: %w", err)
	}
	s.done = true
	// What is left to do is tidying: the next Begin does it where this fails.
	os.Remove(s.swapping)
	os.RemoveAll(s.old)
	_ = s.release(s.held)
	return nil
}

// seal writes the provenance and flushes everything to disk.
func (s *Staging) seal(p Provenance) error {
	if err := os.Remove(filepath.Join(s.fresh, provenanceFile)); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	files, dirs, err := s.staged()
	if err != nil {
		return err
	}
	outputs := make([]File, len(files))
	if err := parallel(len(files), func(i int) (err error) {
		outputs[i], err = flush(s.fresh, files[i])
		return err
	}); err != nil {
		return err
	}
	if p, err = p.finish(outputs); err != nil {
		return err
	}
	b, err := p.encode()
	if err != nil {
		return err
	}
	if err := s.step("provenance"); err != nil {
		return err
	}
	if err := writeDurably(filepath.Join(s.fresh, provenanceFile), b); err != nil {
		return err
	}
	return parallel(len(dirs), func(i int) error { return syncDir(dirs[i]) })
}

// staged lists the files, slash-separated below the staging folder, and the
// folders, it included.
func (s *Staging) staged() (files, dirs []string, err error) {
	err = filepath.WalkDir(s.fresh, func(path string, d fs.DirEntry, err error) error {
		switch {
		case err != nil:
			return err
		case d.IsDir():
			dirs = append(dirs, path)
			return nil
		case !d.Type().IsRegular():
			return fmt.Errorf("%s: not a regular file", path)
		}
		rel, err := filepath.Rel(s.fresh, path)
		files = append(files, filepath.ToSlash(rel))
		return err
	})
	return files, dirs, err
}

// flush makes a staged file durable and hashes it.
func flush(root, name string) (File, error) {
	f, err := os.OpenFile(filepath.Join(root, filepath.FromSlash(name)), os.O_RDWR, 0)
	if err != nil {
		return File{}, err
	}
	h, err := hash(f)
	h.Path = name
	return h, errors.Join(err, f.Sync(), f.Close())
}

func writeDurably(path string, b []byte) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	_, err = f.Write(b)
	return errors.Join(err, f.Sync(), f.Close())
}

// parallel calls f for 0 ≤ i < n on a few goroutines, which wait for the disk
// most of the time, and returns the error of the lowest i.
func parallel(n int, f func(i int) error) error {
	const workers = 8
	errs := make([]error, n)
	var wg sync.WaitGroup
	for w := range min(workers, n) {
		wg.Go(func() {
			for i := w; i < n; i += workers {
				errs[i] = f(i)
			}
		})
	}
	wg.Wait()
	return cmp.Or(errs...)
}

// swap puts the staged files in the place of dir, or leaves all as it was. Old
// results make it a sequence of renames, which a killed process leaves half
// done; the file swapping says so, and repair undoes it.
func (s *Staging) swap() error {
	old, err := stateOf(s.dir)
	if err != nil {
		return err
	}
	previous, err := stateOf(s.previous)
	if err != nil {
		return err
	}
	var moves [][2]string
	if old == ours {
		if err := s.mark(); err != nil {
			return err
		}
		if previous != absent {
			moves = append(moves, [2]string{s.previous, s.old})
		}
		moves = append(moves, [2]string{s.dir, s.previous})
	} else if old == empty {
		if err := os.Remove(s.dir); err != nil {
			return err
		}
	}
	moves = append(moves, [2]string{s.fresh, s.dir})
	for i, m := range moves {
		err := s.step(filepath.Base(m[0]) + " to " + filepath.Base(m[1]))
		if err == nil {
			err = rename(m[0], m[1])
		}
		if err != nil {
			return errors.Join(err, s.undo(moves[:i]))
		}
	}
	// The new results are there. That the disk may not hold their name yet in a
	// power cut is no reason to say otherwise.
	_ = s.step("swapped")
	_ = syncDir(filepath.Dir(s.dir))
	return nil
}

// mark says in a file that the swap has begun.
func (s *Staging) mark() error {
	if err := s.step("mark"); err != nil {
		return err
	}
	if err := writeDurably(s.swapping, nil); err != nil {
		return err
	}
	return syncDir(s.work)
}

// undo takes moves back, last first. Where it cannot, the mark stays for repair.
func (s *Staging) undo(moves [][2]string) error {
	for i := len(moves) - 1; i >= 0; i-- {
		if err := rename(moves[i][1], moves[i][0]); err != nil {
			return fmt.Errorf("and could not be put back: %w; the next run will, or rename it by hand", err)
		}
	}
	return os.RemoveAll(s.swapping)
}

// repair, under the lock, undoes a swap that was interrupted and removes what an
// interrupted run staged. The swap went
//
//	previous → old, dir → previous, new → dir
//
// so that dir is absent only between the last two, and then previous holds the
// results that were in dir.
func (s *Staging) repair() error {
	if exists(s.swapping) {
		if !exists(s.dir) && exists(s.previous) {
			if err := rename(s.previous, s.dir); err != nil {
				return err
			}
		}
		if !exists(s.previous) && exists(s.old) {
			if err := rename(s.old, s.previous); err != nil {
				return err
			}
		}
		if err := os.Remove(s.swapping); err != nil {
			return err
		}
	}
	return errors.Join(os.RemoveAll(s.old), os.RemoveAll(s.fresh))
}

func exists(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}
