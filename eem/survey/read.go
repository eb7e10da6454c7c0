package survey

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"slices"
	"strings"

	toml "github.com/pelletier/go-toml/v2"

	"tarnlight/eem"
)

// maxSettings is the largest settings file that is read, bytes. One with every
// key has 4 kB; go-toml takes 60 µs a key, more in larger files.
const maxSettings = 64 << 10

// ReadSettings reads a settings file. A file that does not exist gives Default.
// Every other fault is of type Problems: each with its line, what is wrong and
// what would be right.
func ReadSettings(path string) (*Settings, error) {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return Default(), nil
	case err != nil:
		return nil, fmt.Errorf("settings cannot be read: %w", err)
	case !info.Mode().IsRegular():
		return nil, fmt.Errorf("%s: the settings must be a file", path)
	case info.Size() > maxSettings:
		return nil, fmt.Errorf("%s: %d bytes are too many for settings; the limit is %d", path, info.Size(), maxSettings)
	}
	data, err := os.ReadFile(path)
	if err != nil {
		return nil, fmt.Errorf("settings cannot be read: %w", err)
	}
	return parseSettings(path, data)
}

// parseSettings reads settings from data; path stands in messages.
func parseSettings(path string, data []byte) (*Settings, error) {
	data = bytes.TrimPrefix(data, []byte("\ufeff"))
	r := settingsReader{path: path, s: Default()}
	var m map[string]any
	if err := toml.Unmarshal(data, &m); err != nil {
		r.syntax(data, err)
		return nil, r.problems.err()
	}
	r.lines = keyLines(data)
	r.table(nil, m)
	r.agree(r.s, nil)
	if err := r.problems.err(); err != nil {
		return nil, err
	}
	return r.s, nil
}

// settingsReader walks a decoded settings file.
type settingsReader struct {
	path     string
	s        *Settings
	lines    map[string]int // line of every key and table, by sep-joined path
	problems Problems
}

const sep = "\x1f" // joins the parts of a path; no key that is known holds it

func (r *settingsReader) add(path []string, format string, args ...any) {
	r.problems.add(r.path, r.line(path), printPath(path), format, args...)
}

// line is where a path stands, or the part of it that was found.
func (r *settingsReader) line(path []string) int {
	for ; len(path) > 0; path = path[:len(path)-1] {
		if n, ok := r.lines[strings.Join(path, sep)]; ok {
			return n
		}
	}
	return 0
}

// stands says whether the file itself holds this key or table.
func (r *settingsReader) stands(path []string) bool {
	return r.lines[strings.Join(path, sep)] > 0
}

func printPath(path []string) string {
	parts := make([]string, len(path))
	for i, p := range path {
		if parts[i] = tomlKey(p); len(p) > shown {
			parts[i] = quote(p)
		}
	}
	return strings.Join(parts, ".")
}

// full reports whether so many problems were found that more help nobody.
func (r *settingsReader) full() bool { return len(r.problems) > 2*maxProblems }

// table reads every key of the table at path.
func (r *settingsReader) table(path []string, m map[string]any) {
	for _, name := range r.inOrder(path, m) {
		if r.full() {
			return
		}
		p, v := append(slices.Clone(path), name), m[name]
		full := strings.Join(p, ".")
		sub, isTable := v.(map[string]any)
		switch k := byName()[full]; {
		case strings.Contains(name, "."):
			r.unknown(p)
		case k != nil:
			if err := k.set(r.s, v); err != nil {
				r.add(p, "%v", err)
			}
		case full == "setup" && isTable:
			r.setups(sub)
		case full == "setup" || isPrefix(full):
			if isTable {
				r.table(p, sub)
			} else {
				r.add(p, "%s is a table; write [%s] on a line of its own and its keys below", full, full)
			}
		default:
			r.unknown(p)
		}
	}
}

// isPrefix says whether some key lies in the table with this name.
func isPrefix(full string) bool {
	for name := range byName() {
		if strings.HasPrefix(name, full+".") {
			return true
		}
	}
	return false
}

// inOrder lists the keys of a table in the order of their lines.
func (r *settingsReader) inOrder(path []string, m map[string]any) []string {
	names := make([]string, 0, len(m))
	for n := range m {
		names = append(names, n)
	}
	at := make(map[string]int, len(names))
	for _, n := range names {
		at[n] = r.line(append(slices.Clone(path), n))
	}
	slices.SortFunc(names, func(a, b string) int {
		if at[a] != at[b] {
			return at[a] - at[b]
		}
		return strings.Compare(a, b)
	})
	return names
}

// unknown reports a key that does not exist, with where it belongs or the
// nearest one that does.
func (r *settingsReader) unknown(p []string) {
	table := strings.Join(p[:len(p)-1], ".")
	name := p[len(p)-1]
	if t, ok := eem.FindTest(name); ok && table == "quality.limit" {
		if t.Code == absorbanceLimit {
			r.add(p, "this limit is set as correct.absorbance_limit")
		} else {
			r.add(p, "this test has no limit to set; it finds that %s", t.What)
		}
		return
	}
	var here, elsewhere []string
	for _, k := range schema() {
		rest, in := strings.CutPrefix(k.full(), table+".")
		if table == "" {
			rest, in = k.full(), true
		}
		if in {
			first, _, _ := strings.Cut(rest, ".")
			if !slices.Contains(here, first) {
				here = append(here, first)
			}
		}
		if k.name == name && k.table != table {
			elsewhere = append(elsewhere, "["+k.table+"]")
		}
	}
	if table == "" {
		here = append(here, "setup")
	}
	r.unknownAmong(p, here, elsewhere)
}

// unknownAmong says that p is none of the names here, and which one may be meant.
func (r *settingsReader) unknownAmong(p, here, elsewhere []string) {
	name := p[len(p)-1]
	near, ok := nearest(name, here)
	switch {
	case ok:
		r.add(p, "there is no such key; did you mean %s?", near)
	case len(elsewhere) > 0:
		r.add(p, "there is no such key here; %s belongs under %s", name, strings.Join(elsewhere, " or "))
	default:
		r.add(p, "there is no such key; the ones here are %s", strings.Join(here, ", "))
	}
}

// syntax reports a file that is no TOML.
func (r *settingsReader) syntax(data []byte, err error) {
	var d *toml.DecodeError
	if !errors.As(err, &d) {
		r.problems.add(r.path, 0, "", "the settings are no TOML: %s", strings.TrimPrefix(err.Error(), "toml: "))
		return
	}
	line, _ := d.Position()
	msg := strings.TrimPrefix(d.Error(), "toml: ")
	remedy := `a setting is name = value, and text stands in quotes: title = "…"`
	switch {
	case bytes.IndexByte(data[:min(len(data), 4)], 0) >= 0:
		remedy = "save the file as UTF-8"
	case strings.Contains(msg, "UTF-8") || strings.Contains(msg, "utf8"):
		remedy = "save the file as UTF-8"
	case strings.Contains(msg, "escape"):
		remedy = `in double quotes \ has a meaning of its own; write paths with / or in single quotes`
	case strings.Contains(msg, "already"):
		remedy = "every key and table may stand only once; remove or join the second one"
	}
	r.problems.add(r.path, line, "", "this is no TOML: %s; %s", msg, remedy)
}
