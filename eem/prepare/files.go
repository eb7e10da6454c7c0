package prepare

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"strings"

	"tarnlight/eem/scanfile"
)

var nan = math.NaN()

// root is the folder that cells of the sheet are relative to.
func (s *Survey) root() string {
	r := filepath.FromSlash(s.Settings.Sheet.Root)
	if filepath.IsAbs(r) {
		return r
	}
	return filepath.Join(s.Dir, r)
}

// resolve lists the raw files of every bottle. A file claimed by two rows is an
// error, unless it names its samples by their ids; a cell that names nothing rejects
// its bottle.
func (s *Survey) resolve() ([][]string, error) {
	files := make([][]string, len(s.Bottles))
	for i, b := range s.Bottles {
		if b.Excluded {
			continue
		}
		list, err := expand(s.root(), b.Row.Scans)
		if err != nil {
			b.reject(s, "unreadable", err.Error())
			continue
		}
		files[i], b.claims = list, list
	}
	return files, s.share(files)
}

// exacter suggests a pattern that does not run into longer names.
func exacter(pattern string) string {
	if strings.HasSuffix(pattern, "*") {
		return strings.TrimSuffix(pattern, "*") + "_*"
	}
	return pattern
}

// expand lists the files that a scans cell names: a file, a folder (the files in
// it, litter left out) or a glob of either.
func expand(root, cell string) ([]string, error) {
	path := filepath.Join(root, filepath.FromSlash(cell))
	matches := []string{path}
	if _, err := os.Stat(path); err != nil && strings.ContainsAny(cell, "*?[") {
		var bad error
		matches, bad = filepath.Glob(path)
		if bad != nil {
			return nil, fmt.Errorf("scans %q is not a pattern: %w", cell, bad)
		}
		if len(matches) == 0 {
			return nil, fmt.Errorf("scans %q matches no file; correct the cell or the [sheet] root", cell)
		}
	}
	var out []string
	for _, m := range matches {
		info, err := os.Stat(m)
		switch {
		case err != nil:
			return nil, fmt.Errorf("scans %q: no such file or folder; correct the cell or the [sheet] root", cell)
		case info.IsDir():
			list, err := os.ReadDir(m)
			if err != nil {
				return nil, fmt.Errorf("scans %q: %w", cell, plain(err))
			}
			for _, e := range list {
				if e.Type().IsRegular() && !Litter(e.Name()) {
					out = append(out, filepath.Join(m, e.Name()))
				}
			}
		case info.Mode().IsRegular():
			out = append(out, m)
		}
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("scans %q holds no file", cell)
	}
	sort.Strings(out)
	return out, nil
}

// Litter says whether a file is no raw file by its name alone: hidden, or left by an
// office program or a file manager.
func Litter(name string) bool {
	return strings.HasPrefix(name, ".") || strings.HasPrefix(name, "~$") || strings.EqualFold(name, "Thumbs.db") || strings.EqualFold(name, "desktop.ini")
}

// plain drops the path from a file error; messages name it in their own way.
func plain(err error) error {
	if pe, ok := err.(*fs.PathError); ok { //nolint:errorlint // the error comes straight from os
		return pe.Err
	}
	return err
}

// short gives a path relative to the survey folder, with slashes.
func (s *Survey) short(path string) string {
	if dir, err := filepath.Abs(s.Dir); err == nil {
		if abs, err := filepath.Abs(path); err == nil {
			if r, err := filepath.Rel(dir, abs); err == nil {
				return filepath.ToSlash(r)
			}
		}
	}
	return filepath.Base(path)
}

// load reads a raw file once: its bytes and what provenance needs.
func (s *Survey) load(path string) ([]byte, Input, error) {
	name := s.short(path)
	data, err := scanfile.Load(path)
	if err != nil {
		return nil, Input{}, fmt.Errorf("%s: %s", name, strings.TrimPrefix(plain(err).Error(), path+": "))
	}
	sum := sha256.Sum256(data)
	return data, Input{Path: name, SHA256: hex.EncodeToString(sum[:]), Size: int64(len(data))}, nil
}

func uniqueInputs(in []Input) []Input {
	slices.SortFunc(in, func(a, b Input) int { return strings.Compare(a.Path, b.Path) })
	return slices.CompactFunc(in, func(a, b Input) bool { return a.Path == b.Path })
}
