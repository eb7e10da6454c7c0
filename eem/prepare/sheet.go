package prepare

import (
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// checkHolding tells where a bottle stood too long between sampling and
// measurement, or was measured before it was sampled.
func (b *Bottle) checkHolding(s *Survey) {
	from, to := b.Row.Sampled, b.Row.Measured
	if from.IsZero() || to.IsZero() || b.Row.Kind == survey.Blank || b.Row.Kind == survey.Standard {
		return
	}
	if from.DateOnly || to.DateOnly {
		from.Time, to.Time = from.Truncate(24*time.Hour), to.Truncate(24*time.Hour)
	}
	days, limit := to.Sub(from.Time).Hours()/24, s.Limit("holding-time")
	n := eem.Note{Test: "holding-time", Severity: eem.Doubt, Measure: true, Value: days, Limit: limit}
	switch {
	case days < 0:
		n.Msg = fmt.Sprintf("measured (%s) before it was sampled (%s); correct one of the dates", b.Row.Measured.Text, b.Row.Sampled.Text)
	case days > limit:
		n.Msg = fmt.Sprintf("measured %.1f days after sampling; dissolved matter changes in a bottle: measure sooner, or state why it kept", days)
	default:
		return
	}
	b.flag(s, n)
}

// tellOf records a finding about a bottle that another bottle gave occasion for.
// It is no part of the bottle's own flags: what a bottle is found to hold must not
// hang on which others were measured.
func (s *Survey) tellOf(b *Bottle, n eem.Note) {
	n = s.judge(n)
	n.File, n.Line = filepath.ToSlash(filepath.Base(s.Sheet.Path)), b.Row.Line
	s.Flags = append(s.Flags, eem.FlagFrom(n, b.Row.ID, b.Batch))
}

// sameContent looks for raw scan files of two bottles that hold the same bytes.
// Scans without light are alike by nature; their bottles are rejected.
func (s *Survey) sameContent() {
	type file struct {
		bottle *Bottle
		path   string
	}
	owner := map[string]file{} // by hash
	for _, b := range s.Bottles {
		if b.Excluded || b.Rejected {
			continue
		}
		var with []*Bottle
		shared := map[*Bottle]int{}
		first := map[*Bottle][2]string{}
		for _, in := range b.scanFiles {
			o, seen := owner[in.SHA256]
			if !seen {
				owner[in.SHA256] = file{b, in.Path}
				continue
			}
			if o.bottle == b || o.path == in.Path { // one file that names its samples
				continue
			}
			if shared[o.bottle]++; shared[o.bottle] == 1 {
				with = append(with, o.bottle)
				first[o.bottle] = [2]string{in.Path, o.path}
			}
		}
		for _, o := range with {
			n := eem.Note{Test: "same-content", Severity: eem.Doubt, Measure: true, Value: float64(shared[o])}
			say := func(who, other *Bottle, mine, theirs string) {
				n.Msg = fmt.Sprintf("%s with the same bytes as those of %q (%s and %s, for example); one of them was copied or exported twice: find the right file", eem.Count(shared[o], "raw file"), other.Row.ID, mine, theirs)
				s.tellOf(who, n)
			}
			say(b, o, first[o][0], first[o][1])
			say(o, b, first[o][1], first[o][0])
		}
	}
}

// maxWalk bounds how many entries of the survey folder are looked at for files
// that no row uses.
const maxWalk = 200_000

// unusedFiles tells of raw files that lie where those of the sheet lie, in the
// same folders or in folders beside them, with the same ending, and that no row
// uses.
func (s *Survey) unusedFiles() {
	used := map[string]bool{}
	place := map[string]bool{} // folder and ending
	for _, b := range s.Bottles {
		for _, f := range s.claimed(b) {
			used[f] = true
			ext := strings.ToLower(filepath.Ext(f))
			place[filepath.Dir(f)+"\x00"+ext] = true
			if dir := filepath.Dir(f); dir != s.root() { // folders beside: one a bottle
				place[filepath.Dir(dir)+"\x00/"+ext] = true
			}
		}
	}
	known, ignored := s.knownFiles(), s.Settings.Sheet.Ignored()
	var left []string
	n := 0
	top := s.root() + string(filepath.Separator) + "." // the folder, where the root is a link to it
	err := filepath.WalkDir(top, func(path string, d fs.DirEntry, err error) error {
		if n++; n > maxWalk {
			return fs.SkipAll
		}
		if err != nil { // a folder that nobody may look into
			return nil //nolint:nilerr // what cannot be listed is not told of
		}
		name := d.Name()
		if d.IsDir() {
			if path != top && (strings.HasPrefix(name, ".") || results(path)) {
				return fs.SkipDir
			}
			return nil
		}
		ext := strings.ToLower(filepath.Ext(name))
		dir := filepath.Dir(path)
		near := place[dir+"\x00"+ext] || dir != s.root() && place[filepath.Dir(dir)+"\x00/"+ext]
		if rel, err := filepath.Rel(s.root(), path); err != nil || ignored(filepath.ToSlash(rel)) {
			return nil //nolint:nilerr // a path that Rel refuses lies nowhere below the root
		}
		if near && !used[path] && d.Type().IsRegular() && !Litter(name) && !known[s.short(path)] {
			left = append(left, s.short(path))
		}
		return nil
	})
	if err != nil || len(left) == 0 {
		return
	}
	show := strings.Join(left[:min(3, len(left))], ", ")
	if len(left) > 3 {
		show += ", …"
	}
	s.Flags = append(s.Flags, eem.FlagFrom(s.judge(eem.Note{Test: "unused-file", Severity: eem.Remark, Measure: true, Value: float64(len(left)),
		File: filepath.ToSlash(filepath.Base(s.Sheet.Path)),
		Msg:  fmt.Sprintf("used by no row: %s (%s); add rows for what counts and move the rest away", eem.Count(len(left), "raw file"), show)}), "", ""))
}

// results says whether a folder holds results, finished or in the making, or what
// was kept of the last ones.
func results(path string) bool {
	if strings.HasSuffix(path, ".work") || strings.HasSuffix(path, ".cache") {
		return true
	}
	_, err := os.Stat(filepath.Join(path, "provenance.json"))
	return err == nil
}

// claimed lists the files that a row names, an excluded one too.
func (s *Survey) claimed(b *Bottle) []string {
	out := b.claims
	if b.Excluded {
		out, _ = expand(s.root(), b.Row.Scans) // what is not there is not unused
	}
	if b.Row.Absorbance != "" {
		out = append(slices.Clip(out), filepath.Join(s.root(), filepath.FromSlash(b.Row.Absorbance)))
	}
	return out
}

// knownFiles are sheet, settings and the other files that the settings name,
// relative to the survey folder.
func (s *Survey) knownFiles() map[string]bool {
	set := s.Settings
	out := map[string]bool{}
	for _, name := range []string{s.short(s.Sheet.Path), "survey.toml", "runsheet.csv", "runsheet.xlsx", "truth.csv",
		set.Sheet.Exclusions, set.Quantify.File, set.Quantify.Limits, set.Resolve.Hold} {
		out[name] = true
	}
	for _, b := range s.Bottles {
		c := b.Setting.Correct
		out[c.ExcitationFactors], out[c.EmissionFactors], out[c.LampScan] = true, true, true
	}
	return out
}

// compareDilutions holds a bottle against its replicate at another dilution, after
// all corrections: with the inner filter corrected and no quenching, both tell the
// same of the bottle.
func (s *Survey) compareDilutions() {
	limit := s.Limit("dilution-differs")
	for _, b := range s.Bottles {
		of := s.bottle(b.Row.ReplicateOf)
		if of == nil || !b.Usable() || !of.Usable() || b.skips(stepDilution) || of.skips(stepDilution) || b.Row.Dilution == of.Row.Dilution || b.twofold == of {
			continue
		}
		r, ok := times(b.EEM, of.EEM.Regrid(b.EEM.Grid))
		if d := 100 * (r - 1); ok && math.Abs(d) > limit {
			s.tellOf(b, eem.Note{Test: "dilution-differs", Severity: eem.Doubt, Measure: true, Value: d, Limit: limit,
				Msg: fmt.Sprintf("%+.1f %% against %q, the same water at dilution %g instead of %g; look at both dilutions, at the absorbance, and for quenching", d, of.Row.ID, of.Row.Dilution, b.Row.Dilution)})
		}
	}
}

// times returns by which factor e is of by least squares, over the cells measured
// in both.
func times(e, of *eem.EEM) (r float64, ok bool) {
	var xy, xx float64
	n := 0
	for i, x := range of.F {
		if e.Why[i] == eem.Measured && of.Why[i] == eem.Measured {
			xy, xx = xy+x*e.F[i], xx+x*x
			n++
		}
	}
	return xy / xx, n > 0 && xx > 0
}

// bottle finds a bottle by id, nil where there is none.
func (s *Survey) bottle(id string) *Bottle {
	if id == "" {
		return nil
	}
	for _, b := range s.Bottles {
		if b.Row.ID == id {
			return b
		}
	}
	return nil
}
