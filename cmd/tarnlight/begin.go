package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"regexp"
	"slices"
	"sort"
	"strings"

	"github.com/spf13/cobra"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

type beginOptions struct {
	dir string
	csv bool
}

// newBeginCmd drafts run sheet and settings.
func newBeginCmd(s streams) *cobra.Command {
	var o beginOptions
	c := &cobra.Command{
		Use:   "begin DIR",
		Short: "Drafts run sheet and settings from a folder of raw files",
		Long: `begin looks at every file below DIR, tells scans from absorbance by content, groups
scans into bottles by their names, and drafts runsheet.xlsx (or runsheet.csv with
--csv) and survey.toml. What is there already is never touched. Read the draft:
kinds and concentrations are known to you alone.`,
		Example: "  tarnlight begin mysurvey\n  tarnlight begin mysurvey --csv",
		Args:    cobra.ExactArgs(1),
	}
	c.Flags().BoolVar(&o.csv, "csv", false, "write runsheet.csv instead of runsheet.xlsx")
	c.RunE = func(_ *cobra.Command, args []string) error { o.dir = args[0]; return runBegin(s, o) }
	return c
}

// found is one raw file and what its content says.
type found struct {
	path  string // relative to the folder, with slashes
	guess scanfile.Guess
}

// drafted is a bottle that begin puts together.
type drafted struct {
	id, scans, absorbance string
	kind                  survey.Kind
	files                 int
}

func runBegin(s streams, o beginOptions) error {
	if err := surveyFolder(o.dir); err != nil {
		return err
	}
	for _, name := range []string{"runsheet.csv", "runsheet.xlsx"} {
		if _, err := os.Stat(filepath.Join(o.dir, name)); err == nil {
			return fmt.Errorf("%s is there already and is not touched; move it away to draft a new one", filepath.Join(o.dir, name))
		}
	}
	bar := newBar(s.err)
	files, err := lookAround(o.dir, bar)
	if err != nil {
		return err
	}
	bottles := groupBottles(files)
	if len(bottles) == 0 {
		return fmt.Errorf("%s: no file below it looks like a scan (%d looked at); put the exported scans there, or state their form in survey.toml", o.dir, len(files))
	}
	assignAbsorbance(bottles, files)
	sheet := draftSheet(bottles)
	name, err := writeDraft(o, sheet)
	if err != nil {
		return err
	}
	t := newText("id", "kind", "scans", "files", "absorbance")
	for _, b := range bottles {
		t.add(b.id, string(b.kind), b.scans, fmt.Sprint(b.files), b.absorbance)
	}
	if err := t.print(s.out); err != nil {
		return err
	}
	for _, f := range files {
		if f.guess.Content == scanfile.Unknown {
			fmt.Fprintf(s.err, "not used: %s (%s)\n", f.path, f.guess.Why)
		}
	}
	fmt.Fprintf(s.err, "drafted: %s\nnext: set kinds, dates and concentrations there, then tarnlight check %s\n", name, o.dir)
	return nil
}

// lookAround looks at every file below dir by content.
func lookAround(dir string, b *bar) ([]found, error) {
	var paths []string
	err := filepath.WalkDir(dir, func(p string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name := d.Name()
		switch {
		case d.IsDir() && p != dir && (strings.HasPrefix(name, ".") || name == "out" || strings.HasPrefix(name, "out.")):
			return filepath.SkipDir
		case !d.Type().IsRegular() || strings.HasPrefix(name, ".") || strings.HasPrefix(name, "~$"):
			return nil
		case filepath.Dir(p) == filepath.Clean(dir) && (name == "survey.toml" || strings.HasPrefix(name, "README")):
			return nil
		}
		paths = append(paths, p)
		return nil
	})
	if err != nil {
		var pe *fs.PathError
		if errors.As(err, &pe) {
			return nil, fmt.Errorf("%s: %w", pe.Path, pe.Err)
		}
		return nil, err
	}
	sort.Strings(paths)
	out := make([]found, 0, len(paths))
	for i, p := range paths {
		rel, err := filepath.Rel(dir, p)
		if err != nil {
			return nil, err
		}
		f := found{path: filepath.ToSlash(rel)}
		if data, err := scanfile.Load(p); err != nil {
			f.guess = scanfile.Guess{Content: scanfile.Unknown, Why: err.Error()}
		} else {
			f.guess = scanfile.Look(f.path, data)
		}
		out = append(out, f)
		b.step(i+1, len(paths), "looking")
	}
	return out, nil
}

// wavelengthTail finds the excitation at the end of the name of a single scan:
// "S1_ex240", "S1-240nm", "scan017".
var wavelengthTail = regexp.MustCompile(`(?i)^(.*?)[ ._-]*(?:ex(?:citation)?)?[ ._-]*\d+(?:[.,]\d+)?[ ._-]*(?:nm)?$`)

// groupBottles puts files together: a file that holds a whole EEM is a bottle;
// single scans of one folder that share the name before the excitation are one.
func groupBottles(files []found) []*drafted {
	var out []*drafted
	byStem := map[string]*drafted{}
	stems := map[string][]string{} // folder → stems in it
	others := map[string]int{}     // folder → files that are no single scans
	for _, f := range files {
		dir, base := path.Split(f.path)
		stem := strings.TrimSuffix(base, path.Ext(base))
		if f.guess.Content != scanfile.ScanContent {
			others[dir]++
			continue
		}
		if f.guess.Excitations > 1 {
			others[dir]++
			out = append(out, &drafted{id: stem, scans: f.path, files: 1})
			continue
		}
		if m := wavelengthTail.FindStringSubmatch(stem); m != nil {
			stem = m[1]
		}
		key := dir + stem
		b := byStem[key]
		if b == nil {
			b = &drafted{id: stem, scans: key}
			byStem[key] = b
			out = append(out, b)
			stems[dir] = append(stems[dir], stem)
		}
		b.files++
	}
	for key, b := range byStem {
		dir := key[:len(key)-len(path.Base(key))]
		if strings.HasSuffix(key, "/") {
			dir = key
		}
		if len(stems[dir]) == 1 && others[dir] == 0 && dir != "" {
			// The folder is the bottle.
			b.scans = strings.TrimSuffix(dir, "/")
			b.id = path.Base(b.scans)
			continue
		}
		b.scans = key + globTail(key, stems[dir], dir)
	}
	for _, b := range out {
		b.kind = guessKind(b.id)
	}
	return uniqueIDs(out)
}

// globTail returns the end of a pattern that catches this stem and no longer one.
func globTail(key string, stems []string, dir string) string {
	stem := strings.TrimPrefix(key, dir)
	for _, s := range stems {
		if s != stem && strings.HasPrefix(s, stem) {
			return "[_. -]*"
		}
	}
	return "*"
}

// guessKind reads what a name says in plain words. Standards and controls need
// concentrations, which no name tells, so they stay samples in a draft.
func guessKind(id string) survey.Kind {
	l := strings.ToLower(id)
	switch {
	case strings.Contains(l, "field") && strings.Contains(l, "blank"):
		return survey.FieldBlank
	case strings.Contains(l, "blank"):
		return survey.Blank
	}
	return survey.Sample
}

// uniqueIDs gives bottles of one name in different folders the folder's too.
func uniqueIDs(list []*drafted) []*drafted {
	count := map[string]int{}
	for _, b := range list {
		count[strings.ToLower(b.id)]++
	}
	for _, b := range list {
		if count[strings.ToLower(b.id)] > 1 || b.id == "" {
			b.id = strings.NewReplacer("/", "-", "*", "").Replace(strings.TrimSuffix(b.scans, path.Ext(b.scans)))
		}
		b.id = strings.TrimLeft(b.id, "=+-@ ") // what a spreadsheet would take for a formula
	}
	taken := map[string]int{}
	for _, b := range list {
		l := strings.ToLower(b.id)
		if taken[l]++; taken[l] > 1 || l == "" {
			b.id = fmt.Sprintf("%s (%d)", b.id, taken[l])
		}
	}
	slices.SortFunc(list, func(a, b *drafted) int { return strings.Compare(a.id, b.id) })
	return list
}

// assignAbsorbance gives each bottle the absorbance file whose name is its id, or
// its id with something behind or before it.
func assignAbsorbance(bottles []*drafted, files []found) {
	for _, b := range bottles {
		id := strings.ToLower(b.id)
		best := ""
		for _, f := range files {
			if f.guess.Content != scanfile.AbsorbContent {
				continue
			}
			base := strings.ToLower(strings.TrimSuffix(path.Base(f.path), path.Ext(f.path)))
			if base == id {
				best = f.path
				break
			}
			rest, isPart := strings.CutPrefix(base, id)
			if !isPart {
				rest, isPart = strings.CutSuffix(base, id)
			}
			if isPart && best == "" && (rest == "" || strings.ContainsAny(rest[:1]+rest[len(rest)-1:], "_-. ")) {
				best = f.path
			}
		}
		b.absorbance = best
	}
}

func draftSheet(bottles []*drafted) *survey.Sheet {
	s := &survey.Sheet{Columns: []string{"id", "kind", "scans", "absorbance", "measured", "site", "dilution", "replicate_of", "exclude"}}
	for i, b := range bottles {
		s.Rows = append(s.Rows, survey.Row{ID: b.id, Kind: b.kind, Scans: b.scans, Absorbance: b.absorbance, Line: i + 2,
			Cells: []string{b.id, string(b.kind), b.scans, b.absorbance, "", "", "", "", ""}})
	}
	return s
}

// writeDraft writes the sheet, and the settings where there are none.
func writeDraft(o beginOptions, sheet *survey.Sheet) (string, error) {
	name := filepath.Join(o.dir, "runsheet.xlsx")
	write := survey.WriteSheetXLSX
	if o.csv {
		name, write = filepath.Join(o.dir, "runsheet.csv"), survey.WriteSheetCSV
	}
	f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return "", err
	}
	err = write(f, sheet)
	if cerr := f.Close(); err == nil {
		err = cerr
	}
	if err != nil {
		return "", err
	}
	set := filepath.Join(o.dir, "survey.toml")
	g, err := os.OpenFile(set, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if errors.Is(err, fs.ErrExist) {
		return name, nil
	}
	if err != nil {
		return "", err
	}
	_, err = g.WriteString(draftSettings)
	if cerr := g.Close(); err == nil {
		err = cerr
	}
	return name, err
}

// draftSettings says nothing that is not a default; it shows where to begin.
const draftSettings = `# Settings of this survey. Every key has a default, so this file may be empty;
# tarnlight settings --list gives them all with their reasons.
title = ""

[scans]
# saturation = 1000000     # counts at which the detector clips
# applied = []             # what was done to the files before they came here

[correct]
# excitation_factors = "correction/excitation.csv"
# emission_factors = "correction/emission.csv"

[resolve]
# components = "auto"      # or a number, a range such as [2, 7], or "off"
`
