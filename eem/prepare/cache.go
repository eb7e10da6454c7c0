package prepare

import (
	"bytes"
	"crypto/sha256"
	"encoding/gob"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"sync"

	"tarnlight/eem"
	"tarnlight/eem/correct"
	"tarnlight/eem/survey"
)

// Cache keeps on disk what Read made of each bottle alone, up to the inner filter,
// so that the next Read takes over the bottles that are as they were. An entry is
// named by the hash of everything that goes into it: raw files, row, settings,
// spectral factors and the program itself. One that is damaged is no entry; the
// folder may be deleted at any time, and nothing but time is lost. Rejected bottles
// are never kept.
//
// Several Reads may share a folder: an entry is written under another name
// and renamed when it is whole.
type Cache struct {
	dir     string
	program string

	mu   sync.Mutex
	used map[string]bool // entries of this Read, by file name
	hits int
	err  error // the first that kept an entry from being written
}

// NewCache returns a cache in folder dir, which is made when the first entry is
// written. program tells one build of the program from another.
func NewCache(dir, program string) *Cache {
	return &Cache{dir: dir, program: program, used: map[string]bool{}}
}

// Hits counts the bottles taken over.
func (c *Cache) Hits() int { return c.hits }

// Err says why entries could not be written, nil where they were.
func (c *Cache) Err() error { return c.err }

// kept is what read leaves in a Bottle. Findings are kept as they came, so that
// place in the sheet, batch and accepted doubts are those of the new run.
type kept struct {
	Guesses             []Guess
	Findings            []eem.Note
	Told                int
	Largest, LinearFrom float64
	Absorb, Scanned     *eem.Absorbance
	Raw, Counts         *eem.EEM
	Gain                []float32
	Noise               *correct.Noise
}

// entryName is the name of an entry; nothing else in the folder is ours.
var entryName = regexp.MustCompile(`^[0-9a-f]{64}\.bottle$`)

// name hashes everything that read makes a bottle of. What settings later steps
// alone depend on is left out by name: a setting that nobody thought of here costs
// time, not truth.
func (c *Cache) name(s *Survey, b *Bottle, files []Input) (string, error) {
	h := sha256.New()
	row, set := *b.Row, *b.Setting
	row.Line, row.Cells = 0, nil
	std := survey.Default()
	set.Title, set.Sheet, set.Grid, set.Quantify, set.Resolve = "", std.Sheet, std.Grid, std.Quantify, std.Resolve
	set.Uncertainty, set.Report, set.Setups = std.Uncertainty, std.Report, nil
	set.Quality = survey.Quality{Limit: s.Settings.Quality.Limit}
	f := s.factors[row.Setup]
	fmt.Fprintf(h, "%q %#v %t %t %q", c.program, row, b.twofold != nil, s.blankRows(row.Setup) < fewestBlanks, f.sums)
	if _, err := set.WriteTo(h); err != nil {
		return "", err
	}
	fmt.Fprintf(h, "%#v", files)
	return hex.EncodeToString(h.Sum(nil)) + ".bottle", nil
}

// load gives the bottle what an entry holds, and says whether there is one.
func (c *Cache) load(name string, s *Survey, b *Bottle) bool {
	data, err := os.ReadFile(filepath.Join(c.dir, name))
	if err != nil || len(data) < sha256.Size {
		return false
	}
	sum, data := data[:sha256.Size], data[sha256.Size:]
	if got := sha256.Sum256(data); !bytes.Equal(sum, got[:]) {
		return false
	}
	var k kept
	if err := gob.NewDecoder(bytes.NewReader(data)).Decode(&k); err != nil {
		return false
	}
	for _, n := range k.Findings {
		b.flag(s, n)
	}
	b.guesses, b.told, b.Largest, b.LinearFrom = k.Guesses, k.Told, k.Largest, k.LinearFrom
	b.Absorb, b.scanned, b.raw, b.EEM = k.Absorb, k.Scanned, k.Raw, k.Raw
	b.counts, b.gain, b.noise = k.Counts, k.Gain, k.Noise
	c.mu.Lock()
	defer c.mu.Unlock()
	c.used[name] = true
	c.hits++
	return true
}

// store keeps what read made of the bottle. After a failure, as on a full disk,
// nothing more is written.
func (c *Cache) store(name string, b *Bottle, findings []eem.Note) {
	c.mu.Lock()
	c.used[name] = true
	broken := c.err != nil
	c.mu.Unlock()
	if broken {
		return
	}
	k := kept{b.guesses, findings, b.told, b.Largest, b.LinearFrom, b.Absorb, b.scanned, b.raw, b.counts, b.gain, b.noise}
	var buf bytes.Buffer
	buf.Write(make([]byte, sha256.Size))
	err := gob.NewEncoder(&buf).Encode(k)
	if err == nil {
		sum := sha256.Sum256(buf.Bytes()[sha256.Size:])
		copy(buf.Bytes(), sum[:])
		err = c.write(name, buf.Bytes())
	}
	if err != nil {
		c.mu.Lock()
		defer c.mu.Unlock()
		c.err = err
	}
}

// write puts a file in place in one step.
func (c *Cache) write(name string, data []byte) error {
	if err := os.MkdirAll(c.dir, 0o777); err != nil {
		return err
	}
	f, err := os.CreateTemp(c.dir, name+"-*")
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	if closing := f.Close(); err == nil {
		err = closing
	}
	if err == nil {
		err = os.Rename(f.Name(), filepath.Join(c.dir, name))
	}
	if err != nil {
		os.Remove(f.Name())
	}
	return err
}

// sweep removes the entries that this Read did not use, and what a run that was
// killed left half written.
func (c *Cache) sweep() {
	list, err := os.ReadDir(c.dir)
	if err != nil {
		return
	}
	for _, d := range list {
		entry, _, _ := bytes.Cut([]byte(d.Name()), []byte("-"))
		if entryName.Match(entry) && !c.used[d.Name()] {
			os.Remove(filepath.Join(c.dir, d.Name()))
		}
	}
}

// Clear removes every entry, and the folder where nothing else is in it.
func (c *Cache) Clear() {
	clear(c.used)
	c.sweep()
	os.Remove(c.dir)
}

// heldBytes is how much of a bottle's raw files is held in memory at once, in
// order to hash all of them before the first is parsed. A bottle with more (one
// has 1 MB at most) is read file by file and not kept.
const heldBytes = 64 << 20

// rawFiles are the raw files of a bottle, each read from disk once.
type rawFiles struct {
	s    *Survey
	held map[string]rawFile // by path
}

type rawFile struct {
	data []byte
	in   Input
	err  error
}

// load returns bytes and hash of one file.
func (r *rawFiles) load(path string) ([]byte, Input, error) {
	if f, ok := r.held[path]; ok {
		return f.data, f.in, f.err
	}
	return r.s.load(path)
}

// hold reads all of the paths and returns what they are; false when they are too
// large or one cannot be read.
func (r *rawFiles) hold(paths []string) ([]Input, bool) {
	r.held = map[string]rawFile{}
	in := make([]Input, 0, len(paths))
	left := int64(heldBytes)
	for _, p := range paths {
		var f rawFile
		f.data, f.in, f.err = r.s.load(p)
		r.held[p] = f
		if left -= f.in.Size; left < 0 || f.err != nil {
			return nil, false
		}
		in = append(in, f.in)
	}
	return in, true
}

// ProgramHash returns the hash of the running program's own file, which no change
// of the program leaves as it is.
func ProgramHash() (string, error) {
	path, err := os.Executable()
	if err != nil {
		return "", err
	}
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return "", err
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}
