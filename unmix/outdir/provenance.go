package outdir

import (
	"bytes"
	"cmp"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
)

const (
	provenanceFile = "provenance.json"
	program        = "tarnlight"
	format         = 1
	maxProvenance  = 256 << 20 // bytes; a million files
)

// A Provenance says what made a folder of results, from what. It holds no time,
// host, user or absolute path: the same inputs give the same bytes.
type Provenance struct {
	Version  string   `json:"version"`         // of tarnlight
	Build    string   `json:"build,omitempty"` // what else the numbers depend on, such as "openblas"
	Platform string   `json:"platform"`        // operating system/architecture; Commit fills it in if empty
	Go       string   `json:"go"`              // the toolchain; Commit fills it in if empty
	Verb     string   `json:"verb,omitempty"`
	Steps    []string `json:"steps"` // in their order
	Inputs   []File   `json:"inputs"`
	Outputs  []File   `json:"outputs"` // Commit fills them in
}

// A File is one file as it was when it was read or written.
type File struct {
	Path   string `json:"path"` // slash-separated; of an input from the survey folder, of an output from the results folder
	SHA256 string `json:"sha256"`
	Size   int64  `json:"size"` // bytes
}

// A document is the file's layout. Its first line tells our folders from others'.
type document struct {
	Program string `json:"program"`
	Format  int    `json:"format"`
	Provenance
}

// HashFile reads the file at path. The result's Path is path with slashes. It
// returns an error for anything but a regular file or a link to one.
func HashFile(path string) (File, error) {
	if err := mustBeRegular(os.Stat(path)); err != nil {
		return File{}, err
	}
	f, err := os.Open(path)
	if err != nil {
		return File{}, err
	}
	defer f.Close()
	h, err := hash(f)
	h.Path = filepath.ToSlash(path)
	return h, err
}

// HashUnder is HashFile with the Path seen from the folder root, as Inputs want
// it.
func HashUnder(root, path string) (File, error) {
	absRoot, err := filepath.Abs(root)
	if err != nil {
		return File{}, err
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return File{}, err
	}
	rel, err := filepath.Rel(absRoot, abs)
	if err != nil {
		return File{}, fmt.Errorf("%s: lies on another drive than %s; copy it into the survey folder", path, root)
	}
	h, err := HashFile(path)
	h.Path = filepath.ToSlash(rel)
	return h, err
}

func mustBeRegular(fi fs.FileInfo, err error) error {
	if err == nil && !fi.Mode().IsRegular() {
		return fmt.Errorf("%s: not a regular file", fi.Name())
	}
	return err
}

func hash(r io.Reader) (File, error) {
	h := sha256.New()
	n, err := io.Copy(h, r)
	return File{SHA256: hex.EncodeToString(h.Sum(nil)), Size: n}, err
}

// finish returns p in the form in which it is written: complete, sorted, and
// without doubles. It panics if an input's path is not relative.
func (p Provenance) finish(outputs []File) (Provenance, error) {
	p.Platform = cmp.Or(p.Platform, runtime.GOOS+"/"+runtime.GOARCH)
	p.Go = cmp.Or(p.Go, runtime.Version())
	p.Steps = append([]string{}, p.Steps...) // [] where nil
	p.Inputs = append([]File{}, p.Inputs...)
	byPath := func(a, b File) int { return strings.Compare(a.Path, b.Path) }
	slices.SortFunc(p.Inputs, byPath)
	p.Inputs = slices.Compact(p.Inputs)
	for i, f := range p.Inputs {
		if f.Path == "" || f.Path[0] == '/' || filepath.IsAbs(filepath.FromSlash(f.Path)) {
			panic(fmt.Sprintf("outdir: input path %q is not relative to the survey folder", f.Path))
		}
		if i > 0 && f.Path == p.Inputs[i-1].Path {
			return p, fmt.Errorf("%s: changed while it was being read; run again", f.Path)
		}
	}
	p.Outputs = append([]File{}, outputs...)
	slices.SortFunc(p.Outputs, byPath)
	return p, nil
}

func (p Provenance) encode() ([]byte, error) {
	var b bytes.Buffer
	enc := json.NewEncoder(&b)
	enc.SetEscapeHTML(false)
	enc.SetIndent("", "\t")
	err := enc.Encode(document{program, format, p})
	return b.Bytes(), err
}

// ReadProvenance returns what the results in dir say of themselves.
func ReadProvenance(dir string) (Provenance, error) {
	d, err := readDocument(os.DirFS(dir))
	if err != nil {
		return Provenance{}, fmt.Errorf("%s: %w", dir, err)
	}
	return d.Provenance, nil
}

// readDocument reads the provenance file of the folder fsys.
func readDocument(fsys fs.FS) (document, error) {
	var d document
	if err := mustBeRegular(fs.Stat(fsys, provenanceFile)); err != nil {
		if errors.Is(err, fs.ErrNotExist) {
			return d, errors.New("no " + provenanceFile)
		}
		return d, err
	}
	f, err := fsys.Open(provenanceFile)
	if err != nil {
		return d, err
	}
	defer f.Close()
	b, err := io.ReadAll(io.LimitReader(f, maxProvenance+1))
	switch {
	case err != nil:
		return d, err
	case len(b) > maxProvenance:
		return d, fmt.Errorf("%s is larger than %d MiB", provenanceFile, maxProvenance>>20)
	}
	if err := json.Unmarshal(b, &d); err != nil {
		return d, fmt.Errorf("%s is damaged: %w", provenanceFile, err)
	}
	if d.Program != program {
		return d, fmt.Errorf("%s is not of %s", provenanceFile, program)
	}
	if d.Format > format {
		return d, fmt.Errorf("%s was written by a later version, %s", provenanceFile, d.Version)
	}
	return d, nil
}
