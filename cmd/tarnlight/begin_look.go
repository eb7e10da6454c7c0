package main

import (
	"context"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// found is one raw file and what its content says.
type found struct {
	path    string // relative to the root, with slashes
	written time.Time
	guess   scanfile.Guess
	rows    []*survey.Row // that name it already: those of some of its samples
}

// single says whether a file holds scans of one excitation, of which a bottle may
// have more.
func (f *found) single() bool {
	return f.guess.Content == scanfile.ScanContent && f.guess.Excitations <= 1
}

// lookAround looks at every file below the root by content, but for those that a
// row claims; where several do, the file names its samples and may have got more of
// them since. Links are not followed, so that nothing outside is read.
func (b *beginning) lookAround(ctx context.Context, claims prepare.Claimed) ([]found, error) {
	paths, err := b.list(claims)
	if err != nil {
		return nil, err
	}
	out := make([]found, 0, len(paths))
	set := prepare.ScanSettings(b.set.Scans)
	for i, p := range paths {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		f := found{path: b.rel(p), rows: claims[p]}
		info, err := os.Lstat(p)
		if err == nil {
			f.written = info.ModTime()
			var data []byte
			if data, err = scanfile.Load(p); err == nil {
				f.guess = scanfile.Look(f.path, data, set)
			}
		}
		if errors.Is(err, fs.ErrNotExist) {
			b.leave(f.path, "vanished while it was looked at")
			continue
		}
		if err != nil {
			f.guess = scanfile.Guess{Content: scanfile.Unknown, Why: strings.TrimLeft(strings.TrimPrefix(err.Error(), p), ": "), Err: err, NoText: true}
		}
		if len(f.rows) > 0 && len(f.guess.Samples) < 2 {
			continue
		}
		out = append(out, f)
		b.bar.step(i+1, len(paths), "looking")
	}
	return out, nil
}

// list finds the files in order of their paths. Results, hidden files, those that
// office programs leave and those that the settings name are passed over.
func (b *beginning) list(claims prepare.Claimed) ([]string, error) {
	var paths, links []string
	ignored, known := b.set.Sheet.Ignored(), b.knownFiles()
	top := b.root + string(filepath.Separator) + "." // the folder, where the root is a link to it
	err := filepath.WalkDir(top, func(p string, d fs.DirEntry, err error) error {
		if err != nil {
			return b.unlisted(p, p == top, err)
		}
		name := d.Name()
		switch {
		case d.IsDir() && p != top && (strings.HasPrefix(name, ".") || name == "out" || strings.HasPrefix(name, "out.") ||
			strings.HasSuffix(name, ".work") || strings.HasSuffix(name, ".cache") || isResults(p)):
			return filepath.SkipDir
		case p != top && ignored(b.rel(p)):
			b.passed++
			if d.IsDir() {
				return filepath.SkipDir
			}
			return nil
		case d.Type()&fs.ModeSymlink != 0 && len(claims[p]) == 0:
			links = append(links, b.rel(p))
			return nil
		case !d.Type().IsRegular() || prepare.Litter(name):
			return nil
		case len(claims[p]) == 1 || known[p] || own(b.rel(p)):
			return nil
		}
		paths = append(paths, p)
		return nil
	})
	if len(links) > 0 {
		b.leave(some(links), "links are not followed; name the folder they lead to as root under [sheet] in survey.toml, or copy the files")
	}
	slices.Sort(paths)
	return paths, err
}

// unlisted goes on past a folder that cannot be listed, unless it is the root.
func (b *beginning) unlisted(p string, root bool, err error) error {
	switch {
	case root:
		return err
	case errors.Is(err, fs.ErrNotExist):
		return nil // vanished
	}
	b.leaveOpen(b.rel(p), "it cannot be looked into (%v); let it be read, or name it as ignore under [sheet] in survey.toml", pathless(err))
	return fs.SkipDir
}

// pathless drops the path from a file error.
func pathless(err error) error {
	var pe *fs.PathError
	if errors.As(err, &pe) {
		return pe.Err
	}
	return err
}

func (b *beginning) rel(path string) string {
	r, err := filepath.Rel(b.root, path)
	if err != nil {
		return path
	}
	return filepath.ToSlash(r)
}
