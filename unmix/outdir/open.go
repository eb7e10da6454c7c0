package outdir

import (
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// openElsewhere looks in the folders that a Commit renames.
func (p places) openElsewhere() error {
	if err := openElsewhere(p.dir); err != nil {
		return err
	}
	return openElsewhere(p.previous)
}

// openElsewhere returns an *Error of kind ErrOpenElsewhere if another program
// has a file below dir open: where the system locks open files it is asked;
// elsewhere office programs leave an owner file beside the one they edit, and
// would write their copy over the new one.
func openElsewhere(dir string) error {
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if busy(path) {
			return &Error{ErrOpenElsewhere, path, "is open in another program; close it there and run again (nothing was touched)"}
		}
		if doc := ownedBy(path); doc != "" {
			return &Error{ErrOpenElsewhere, doc, leftBehind(d.Name())}
		}
		return nil
	})
	if os.IsNotExist(err) {
		return nil
	}
	return err
}

// ownedBy returns the document beside path that path is the owner file of, ""
// where it is none. The names are the office programs' (from memory):
// "~$" before the name or in place of its first two characters, and
// ".~lock." before with "#" behind.
func ownedBy(path string) string {
	dir, base := filepath.Split(path)
	if name, ok := strings.CutPrefix(base, ".~lock."); ok && strings.HasSuffix(name, "#") {
		return existing(dir, func(doc string) bool { return doc == strings.TrimSuffix(name, "#") })
	}
	if name, ok := strings.CutPrefix(base, "~$"); ok && name != "" {
		return existing(dir, func(doc string) bool {
			return doc == name || doc != base && len([]rune(doc)) == len([]rune(name))+2 && strings.HasSuffix(doc, name)
		})
	}
	return ""
}

// existing returns the path of the first file in dir whose name is wanted.
func existing(dir string, wanted func(string) bool) string {
	list, err := os.ReadDir(dir)
	if err != nil {
		return ""
	}
	for _, d := range list {
		if !d.IsDir() && wanted(d.Name()) {
			return filepath.Join(dir, d.Name())
		}
	}
	return ""
}

// isLitter reports whether a file that no run wrote is of no interest to anyone:
// owner files, and what file managers leave behind.
func isLitter(base string) bool {
	switch base {
	case ".DS_Store", "Thumbs.db", "desktop.ini":
		return true
	}
	return strings.HasPrefix(base, "~$") || strings.HasPrefix(base, ".~lock.")
}
