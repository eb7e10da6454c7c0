package main

import (
	"path"
	"regexp"
	"slices"
	"strings"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// separators stand between the parts of a name.
const separators = "_-. "

// How well the name of an absorbance file fits a bottle.
const (
	partFits   = 1 // the bottle's name with something before or behind it
	nameFits   = 2
	patternFit = 3 // id by the pattern
	dayFits    = 4 // and day
)

// assignAbsorbance gives each bottle the absorbance file that fits its name best,
// of two that fit alike the one in a nearer folder. A file serves one bottle; where
// two serve equally well none is taken, and that is told. It returns the files by
// path that serve.
func (b *beginning) assignAbsorbance(bottles []*drafted, files []found) map[string]*found {
	var list []*found
	for i := range files {
		if files[i].guess.Content == scanfile.AbsorbContent {
			list = append(list, &files[i])
		}
	}
	var p *scanfile.Pattern
	if b.name != "" {
		p, _ = scanfile.CompilePattern(b.name) // run has compiled it before
	}
	used := map[string]*found{}
	for _, least := range []int{nameFits, partFits} {
		for _, d := range bottles {
			if d.absorbance != "" || d.aside != "" {
				continue
			}
			f, twice := bestOf(d, list, used, p, least)
			if f != nil && !survey.PlainCell(f.path) {
				b.leave(f.path, "its name cannot stand in a run sheet; rename it")
				b.told[f.path] = true
			} else if twice {
				b.leave(f.path, "it and another file fit "+d.id+" equally well; write the right one into the column absorbance")
				b.told[f.path] = true
			} else if f != nil {
				d.absorbance, used[f.path] = f.path, f
			}
		}
	}
	return used
}

// bestOf finds the file that fits a bottle best, and says whether another does as
// well.
func bestOf(d *drafted, list []*found, used map[string]*found, p *scanfile.Pattern, least int) (best *found, twice bool) {
	top := [2]int{}
	for _, f := range list {
		if used[f.path] != nil {
			continue
		}
		v := [2]int{fit(d, f, p), near(d.dir, path.Dir(f.path))}
		switch c := slices.Compare(v[:], top[:]); {
		case v[0] < least || c < 0:
		case c == 0:
			twice = true
		default:
			best, top, twice = f, v, false
		}
	}
	return best, twice
}

// dayIn finds days in paths.
var dayIn = regexp.MustCompile(`(?:^|[^0-9])((?:19|2[01])[0-9]{2})[-_]?([01][0-9])[-_]?([0-3][0-9])(?:[^0-9]|$)`)

// otherDay says whether a path speaks of a day and not of this one.
func otherDay(file, day string) bool {
	m := dayIn.FindStringSubmatch(file)
	return m != nil && day != "" && strings.Join(m[1:], "-") != day
}

// fit says how well a file's name fits a bottle's; 0 is not at all.
func fit(d *drafted, f *found, p *scanfile.Pattern) int {
	if otherDay(f.path, d.day) {
		return 0
	}
	if p != nil {
		if got, ok := p.Match(f.path); ok {
			if strings.EqualFold(got["id"], d.first) {
				if got["date"] != "" && got["date"] == d.day {
					return dayFits
				}
				return patternFit
			}
		}
	}
	base := strings.ToLower(strings.TrimSuffix(path.Base(f.path), endingOf(f.path)))
	best := 0
	for _, id := range []string{strings.ToLower(d.first), strings.ToLower(d.stem)} {
		if id == "" {
			continue
		}
		if base == id {
			return nameFits
		}
		if rest, ok := strings.CutPrefix(base, id); ok && strings.IndexByte(separators, rest[0]) >= 0 {
			best = partFits
		}
		if rest, ok := strings.CutSuffix(base, id); ok && strings.IndexByte(separators, rest[len(rest)-1]) >= 0 {
			best = partFits
		}
	}
	return best
}

// near counts the folders that two paths share by name.
func near(a, b string) int {
	n := 0
	other := strings.Split(b, "/")
	for _, part := range strings.Split(a, "/") {
		if slices.Contains(other, part) {
			n++
		}
	}
	return n
}
