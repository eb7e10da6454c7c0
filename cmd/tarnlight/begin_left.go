package main

import (
	"cmp"
	"fmt"
	"path/filepath"
	"strings"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// tellLeft names what was not used, one line for all files of which the same is to
// be said: absorbance without a bottle, tables, files without numbers.
func (b *beginning) tellLeft(files []found, serve map[string]*found) {
	var p *scanfile.Pattern
	if b.name != "" {
		p, _ = scanfile.CompilePattern(b.name) // run has compiled it before
	}
	alike := map[string][]*found{}
	var order []string
	for i := range files {
		f := &files[i]
		why := b.leftWhy(f, serve)
		if why == "" {
			continue
		}
		if b.add && b.young(f.written) {
			if p == nil {
				continue
			}
			if _, fits := p.Match(f.path); fits && f.guess.Content == scanfile.Unknown {
				b.waits(f.path, f.written)
			}
			continue
		}
		if alike[why] == nil {
			order = append(order, why)
		}
		alike[why] = append(alike[why], f)
	}
	for _, why := range order {
		b.leave(pathsOf(alike[why]), why+only(alike[why]))
	}
	if b.passed > 0 {
		fmt.Fprintf(b.bar, "passed over, because [sheet] ignore names them: %d\n", b.passed)
	}
}

// leftWhy says why a file was not used, empty where it was, or where that was told.
func (b *beginning) leftWhy(f *found, serve map[string]*found) string {
	if b.told[f.path] {
		return ""
	}
	switch f.guess.Content {
	case scanfile.ScanContent:
		return ""
	case scanfile.AbsorbContent:
		if serve[f.path] != nil {
			return ""
		}
		return "absorbance, and no new bottle has its name; write it into the row that it belongs to"
	case scanfile.FactorContent:
		return "spectral factors; name them as emission_factors or excitation_factors under [correct] in survey.toml"
	case scanfile.TableContent:
		return "no scan but a table; known concentrations belong into conc: columns of the run sheet, limits are named under [quantify] limits in survey.toml"
	case scanfile.WorkbookContent:
		return "a workbook or an archive; scans are read from text files, export them as such"
	}
	return cmp.Or(f.guess.Why, "no scan")
}

// pathsOf lists files for people.
func pathsOf(list []*found) string {
	paths := make([]string, len(list))
	for i, f := range list {
		paths[i] = f.path
	}
	return some(paths)
}

// only adds the columns of a table that stands alone.
func only(list []*found) string {
	if len(list) == 1 && list[0].guess.Content == scanfile.TableContent && list[0].guess.Why != "" {
		return " (" + strings.TrimPrefix(list[0].guess.Why, "a table ") + ")"
	}
	return ""
}

// knownFiles are the files that the settings name, as paths.
func (b *beginning) knownFiles() map[string]bool {
	out := map[string]bool{}
	add := func(set *survey.Settings) {
		for _, name := range []string{set.Sheet.Exclusions, set.Quantify.File, set.Quantify.Limits, set.Resolve.Hold,
			set.Correct.ExcitationFactors, set.Correct.EmissionFactors, set.Correct.LampScan} {
			if path := filepath.FromSlash(name); filepath.IsAbs(path) {
				out[filepath.Clean(path)] = true
			} else if name != "" {
				out[filepath.Join(b.dir, path)] = true
			}
		}
	}
	add(b.set)
	for name := range b.set.Setups {
		if set, err := b.set.For(name); err == nil {
			add(set)
		}
	}
	return out
}
