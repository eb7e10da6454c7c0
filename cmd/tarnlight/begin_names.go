package main

import (
	"fmt"
	"math"
	"path"
	"regexp"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/unicode/norm"

	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

// named is what the name of a file says.
type named struct {
	id, day  string // day empty: the name tells none
	kind     survey.Kind
	dilution float64 // 0: the name tells none
	n        int     // of a repetition; 0 and 1 are the first
	repeats  bool    // a word calls it a duplicate
}

// key tells the bottles of one folder apart.
func (n named) key() string {
	return fmt.Sprint(n.id, "\x00", n.kind, "\x00", n.day, n.n, n.repeats, n.dilution)
}

// order puts a repetition behind what it repeats.
func (n named) order() int {
	if n.repeats {
		return math.MaxInt
	}
	return n.n
}

// formulaMarks begin what a spreadsheet would take for a formula.
const formulaMarks = "=+-@＝＋－＠ "

// naming reads names by a pattern.
type naming struct {
	pattern *scanfile.Pattern
	kinds   map[string]survey.Kind // the laboratory's own words
	stems   map[string]string      // path → its name without the excitation
}

// kindWords are the words for kinds that every laboratory may use (common
// practice, no source).
var kindWords = map[string]survey.Kind{"sample": survey.Sample, "blank": survey.Blank, "field-blank": survey.FieldBlank, "fieldblank": survey.FieldBlank,
	"standard": survey.Standard, "std": survey.Standard, "control": survey.Control, "ctrl": survey.Control, "qc": survey.Control, "spike": survey.Spike}

// duplicateWords call a bottle the repetition of another.
var duplicateWords = map[string]bool{"dup": true, "duplicate": true, "rep": true, "replicate": true}

// of reads the name of a file; why says why it cannot.
func (w *naming) of(f *found) (n named, why string) {
	got, ok := w.match(f)
	if !ok {
		return n, fmt.Sprintf("its name does not follow %s", w.pattern)
	}
	n.id, n.day = norm.NFC.String(strings.TrimSpace(got["id"])), got["date"]
	n.id = strings.TrimLeft(n.id, formulaMarks)
	if n.id == "" || strings.ContainsFunc(n.id, unicode.IsControl) || !utf8.ValidString(n.id) {
		return n, "its name gives no id that a run sheet can hold"
	}
	if n.day != "" && (n.day < "1900" || n.day >= "2200") {
		return n, fmt.Sprintf("the day %s in its name cannot be right", n.day)
	}
	if w.pattern.Has("dilution") {
		if n.dilution, _ = strconv.ParseFloat(got["dilution"], 64); n.dilution < 1 {
			return n, fmt.Sprintf("the dilution %s in its name is below 1; it is final volume over sample volume", got["dilution"])
		}
	}
	n.kind = survey.Sample
	switch word := strings.ToLower(got["kind"]); {
	case !w.pattern.Has("kind"):
		n.kind = guessKind(n.id, w.kinds)
	case w.kinds[word] != "":
		n.kind = w.kinds[word]
	case kindWords[word] != "":
		n.kind = kindWords[word]
	case duplicateWords[word]:
		n.repeats = true
	default:
		return n, fmt.Sprintf("nobody knows the kind %q; say what it is under [sheet] in survey.toml: kinds = {%s = \"sample\"}", got["kind"], got["kind"])
	}
	if w.pattern.Has("n") && (w.pattern.Has("nm") || !f.single()) { // else it counts the scans of a bottle
		n.n, _ = strconv.Atoi(got["n"])
	}
	return n, ""
}

// match tries the name without the excitation of a single scan first, where the
// pattern has no place for it.
func (w *naming) match(f *found) (map[string]string, bool) {
	if short, cut := w.stems[f.path]; cut && !w.pattern.Has("nm") && f.single() {
		if got, ok := w.pattern.Match(short); ok {
			return got, true
		}
	}
	return w.pattern.Match(f.path)
}

// guessKind reads what an id says in plain words, or by the letters that it begins
// with where the laboratory says what they stand for. Standards and controls need
// concentrations, which no name tells, so they stay samples.
func guessKind(id string, own map[string]survey.Kind) survey.Kind {
	l := strings.ToLower(id)
	if k := own[l[:len(l)-len(strings.TrimLeftFunc(l, unicode.IsLetter))]]; k != "" {
		return k
	}
	switch {
	case strings.Contains(l, "field") && strings.Contains(l, "blank"):
		return survey.FieldBlank
	case strings.Contains(l, "blank"):
		return survey.Blank
	}
	return survey.Sample
}

// wavelengthTail finds the excitation at the end of the name of a single scan:
// "S1_ex240", "S1-240nm", "scan017".
var wavelengthTail = regexp.MustCompile(`(?i)^(.*?)[ ._-]*(?:ex(?:citation)?)?[ ._-]*(\d+(?:[.,]\d+)?)[ ._-]*(?:nm)?$`)

// saysExcitation finds an excitation that is called one.
var saysExcitation = regexp.MustCompile(`(?i)(?:^|[ ._-])ex(?:citation)?[ ._-]*\d+(?:[.,]\d+)?[ ._-]*(?:nm)?$|\d[ ._-]*nm$`)

// stemsOf gives every single scan's path without the excitation in its name, and
// without its ending. A number that is not the excitation counts scans only where
// the excitations of all files that share the rest differ: S1 and S2 that hold one
// excitation each are two bottles.
func stemsOf(files []found) map[string]string {
	out := map[string]string{}
	counted := map[string][]*found{}
	for i := range files {
		f := &files[i]
		if !f.single() {
			continue
		}
		whole := strings.TrimSuffix(f.path, endingOf(f.path))
		dir, base := path.Split(whole)
		m := wavelengthTail.FindStringSubmatch(base)
		switch out[f.path] = whole; {
		case m == nil:
		case isExcitation(m[2], f):
			out[f.path] = dir + m[1]
		default:
			counted[dir+m[1]] = append(counted[dir+m[1]], f)
		}
	}
	for stem, list := range counted {
		seen := map[float64]bool{}
		for _, f := range list {
			if ex := f.guess.Ex[0]; ex == ex {
				seen[ex] = true
			}
		}
		if len(list) > 1 && (len(seen) == len(list) || len(seen) == 0) {
			for _, f := range list {
				out[f.path] = stem
			}
		}
	}
	return out
}

// endingOf is the ending of a file name: a point and what follows it when that has
// a letter, so that ex350.5 stays whole.
func endingOf(name string) string {
	if ext := path.Ext(name); strings.IndexFunc(ext, unicode.IsLetter) >= 0 {
		return ext
	}
	return ""
}

func isExcitation(number string, f *found) bool {
	v, err := strconv.ParseFloat(strings.Replace(number, ",", ".", 1), 64)
	return err == nil && math.Abs(v-f.guess.Ex[0]) <= 0.5
}

// proposals are patterns that names often follow, those that tell more first.
var proposals = []string{"{date}_{kind}_{id}", "{date}-{kind}-{id}", "{date}/{kind}_{id}", "{kind}_{id}_{date}", "{kind}_{id}", "{kind}-{id}",
	"{date}_{id}", "{date}-{id}", "{id}_{date}", "{id}-{date}", "{date}/{id}", "{date}/{id}/*", "{id}", "{id}/*"}

// propose returns the first pattern that the names of all scans follow, and that
// tells as many bottles apart as they do; empty where there is none.
func (b *beginning) propose(files []found) string {
	stems := stemsOf(files)
	apart := map[string]bool{}
	for i := range files {
		if f := &files[i]; f.guess.Content == scanfile.ScanContent {
			if s, ok := stems[f.path]; ok {
				apart[s] = true
			} else {
				apart[f.path] = true
			}
		}
	}
	for _, text := range proposals {
		p, err := scanfile.CompilePattern(text)
		if err != nil {
			panic(err)
		}
		w := &naming{p, b.set.Sheet.Kinds, stems}
		seen := map[string]bool{}
		fits := true
		for i := range files {
			if f := &files[i]; fits && f.guess.Content == scanfile.ScanContent {
				n, why := w.of(f)
				fits = why == ""
				seen[path.Dir(f.path)+"\x00"+n.key()] = true
			}
		}
		if fits && len(seen) == len(apart) {
			return text
		}
	}
	return ""
}
