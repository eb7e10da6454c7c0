package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"os/exec"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// root is the top of the repository, seen from this package.
const root = "../.."

// packages holds what each package may import beside the standard library:
// packages of this module by their folder, others by their name in modules. It
// is written in the direction of the data, and a package may only name packages
// above itself.
var packages = []struct{ name, may string }{
	{"nnls", "gonum netlib"},

	{"eem", "gonum"},
	{"eem/testkit", ""}, // for tests alone
	{"eem/netcdf", ""},  // knows no spectroscopy
	{"eem/scanfile", "gonum excelize text eem"},
	{"eem/correct", "gonum eem"},
	{"eem/scatter", "gonum eem"},
	{"eem/optics", "gonum eem"},
	{"eem/synth", "gonum eem"},
	{"eem/survey", "toml text excelize eem eem/scanfile"}, // tables are read by scanfile
	{"eem/prepare", "gonum eem eem/netcdf eem/scanfile eem/correct eem/scatter eem/optics eem/survey"},

	{"unmix", "gonum eem nnls"},
	{"unmix/parafac", "gonum eem nnls unmix"},
	{"unmix/merit", "gonum eem eem/scatter nnls unmix"},
	{"unmix/plan", "gonum eem eem/scatter eem/correct unmix unmix/merit"},
	{"unmix/outdir", ""}, // knows no spectroscopy
	{"unmix/report", "gonum plot fonts excelize eem eem/netcdf eem/optics eem/survey unmix unmix/parafac unmix/merit unmix/plan"},

	{"cmd/tarnlight", "gonum excelize toml text term cobra " +
		"eem eem/netcdf eem/scanfile eem/correct eem/scatter eem/optics eem/synth eem/survey eem/prepare " +
		"nnls unmix unmix/parafac unmix/merit unmix/plan unmix/outdir unmix/report"},
}

// modules gives the short names of the table above as import path prefixes.
var modules = map[string][]string{
	"gonum":    {"gonum.org/v1/gonum"},
	"netlib":   {"gonum.org/v1/netlib", "C"}, // behind the tag openblas
	"plot":     {"gonum.org/v1/plot"},
	"fonts":    {"codeberg.org/go-fonts/liberation", "golang.org/x/image"},
	"excelize": {"github.com/xuri/excelize/v2"},
	"toml":     {"github.com/pelletier/go-toml/v2"},
	"text":     {"golang.org/x/text"},
	"term":     {"golang.org/x/term"},
	"cobra":    {"github.com/spf13/cobra", "github.com/spf13/pflag"},
}

// TestImports reads the source files rather than asking the go command, whose
// answer the test cache would not know to be old. Tests may import what they like.
func TestImports(t *testing.T) {
	table := map[string]string{}
	for _, p := range packages {
		table[p.name] = p.may
	}
	seen := map[string]bool{}
	for _, file := range sourceFiles(t) {
		pkg := path.Dir(file)
		may, ok := table[pkg]
		if !ok {
			if !seen[pkg] {
				t.Errorf("package %s is not in the table of imports_test.go", pkg)
			}
			seen[pkg] = true
			continue
		}
		seen[pkg] = true
		f, err := parser.ParseFile(token.NewFileSet(), filepath.Join(root, file), nil, parser.ImportsOnly)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, spec := range f.Imports {
			imp, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				t.Errorf("%s: %v", file, err)
			} else if !allowed(imp, strings.Fields(may)) {
				t.Errorf("%s imports %q, which the table of imports_test.go does not allow to %s", file, imp, pkg)
			}
		}
	}
	if len(seen) == 0 {
		t.Fatal("no source files found")
	}
}

// TestImportTablePointsLeft checks the table itself.
func TestImportTablePointsLeft(t *testing.T) {
	above := map[string]bool{}
	for _, p := range packages {
		for _, name := range strings.Fields(p.may) {
			if _, ok := modules[name]; !ok && !above[name] {
				t.Errorf("%s may import %s, which is neither a module nor a package above it", p.name, name)
			}
		}
		above[p.name] = true
	}
}

func TestAllowed(t *testing.T) {
	for _, c := range []struct {
		imp, may string
		want     bool
	}{
		{"math", "", true},
		{"encoding/csv", "", true},
		{"tarnlight/eem", "gonum eem", true},
		{"tarnlight/eem/scatter", "gonum eem", false},
		{"tarnlight/nnls", "gonum eem", false},
		{"gonum.org/v1/gonum/mat", "gonum eem", true},
		{"gonum.org/v1/gonum", "gonum eem", true},
		{"gonum.org/v1/gonumx/mat", "gonum eem", false},
		{"github.com/xuri/excelize/v2", "gonum eem", false},
		{"C", "gonum", false},
		{"C", "netlib", true},
	} {
		if got := allowed(c.imp, strings.Fields(c.may)); got != c.want {
			t.Errorf("allowed(%q, %q) = %v", c.imp, c.may, got)
		}
	}
}

// allowed reports whether a package that may import what the names stand for
// may import imp.
func allowed(imp string, names []string) bool {
	if pkg, ok := strings.CutPrefix(imp, "tarnlight/"); ok {
		return slices.Contains(names, pkg)
	}
	if first, _, _ := strings.Cut(imp, "/"); imp != "C" && !strings.Contains(first, ".") {
		return true // the standard library
	}
	for _, name := range names {
		for _, prefix := range modules[name] {
			if imp == prefix || strings.HasPrefix(imp, prefix+"/") {
				return true
			}
		}
	}
	return false
}

// sourceFiles lists the Go files of the module that are no tests, whatever
// their build tags, slash separated from root.
func sourceFiles(t *testing.T) []string {
	var files []string
	err := fs.WalkDir(os.DirFS(root), ".", func(name string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		base := d.Name()
		hidden := name != "." && (base[0] == '.' || base[0] == '_')
		switch {
		case d.IsDir() && (hidden || base == "testdata"):
			return fs.SkipDir
		case d.IsDir() || hidden || !strings.HasSuffix(base, ".go") || strings.HasSuffix(base, "_test.go"):
			return nil
		}
		files = append(files, name)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}

// TestTopLevel keeps the first thing a reader sees short: whatever git tracks
// lies in one of the folders and files named here, or in a dotfile.
func TestTopLevel(t *testing.T) {
	index, err := git("rev-parse", "--git-path", "index")
	if err != nil {
		t.Skip("not a git checkout, or no git:", err)
	}
	if index = strings.TrimSpace(index); !filepath.IsAbs(index) {
		index = filepath.Join(root, index)
	}
	// Looked at, so that the test cache knows the answer is old when git's index changes.
	if _, err := os.Stat(index); err != nil {
		t.Log(err)
	}
	list, err := git("ls-files", "-z")
	if err != nil {
		t.Fatal(err)
	}
	may := strings.Fields("cmd eem nnls unmix testdata go.mod go.sum README.md DEVELOPERS.md LICENSE")
	told := map[string]bool{}
	for _, file := range strings.Split(list, "\x00") {
		top, _, _ := strings.Cut(file, "/")
		if top == "" || top[0] == '.' || told[top] || slices.Contains(may, top) {
			continue
		}
		told[top] = true
		t.Errorf("%s: the top level holds %v and dotfiles only", top, may)
	}
}

// git runs git at the top of the repository.
func git(args ...string) (string, error) {
	cmd := exec.Command("git", args...)
	cmd.Dir = root
	out, err := cmd.Output()
	return string(out), err
}
