package main

import (
	"fmt"
	"path"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// withCells gives the bottles their cells. Where the one file with another ending
// keeps a bottle from having one, it is set aside and the bottle goes on.
func (b *beginning) withCells(list []*drafted) []*drafted {
	var out []*drafted
	for _, d := range list {
		odd := b.cellOrOdd(d)
		if d.scans == "" {
			b.leaveOpen(d.name(), "no scans cell can name these files and nothing else (%s); give them names that begin alike and are nobody else's, one ending, or a folder of their own", some(d.files))
			continue
		}
		out = append(out, d)
		if odd != nil {
			out = append(out, odd)
		}
	}
	return out
}

// cellOrOdd gives a bottle its cell, if need be without the files whose ending is not
// that of most: those come back as a bottle that is set aside.
func (b *beginning) cellOrOdd(d *drafted) *drafted {
	var ok bool
	if d.scans, ok = b.cell(d); ok {
		return nil
	}
	most, odd := byEnding(d.files)
	if len(odd) == 0 || len(odd) >= len(most) {
		return nil
	}
	rest, all := &drafted{dir: d.dir, stem: d.stem, files: odd, youngest: d.youngest}, d.files
	d.files = most
	if d.scans, ok = b.cell(d); !ok {
		d.files = all
		return nil
	}
	if rest.scans, ok = b.cell(rest); !ok {
		b.leaveOpen(some(odd), "%s", oddEnding(d, odd))
		return nil
	}
	base := path.Base(odd[0])
	rest.named = named{id: plainID(strings.TrimSuffix(base, endingOf(base))), kind: d.kind}
	rest.first, rest.aside, rest.misnamed = rest.id, oddEnding(d, odd), true
	return rest
}

// oddEnding says what is wrong with files of another ending than the bottle's.
func oddEnding(d *drafted, odd []string) string {
	return fmt.Sprintf("by its name it is a scan of %s, whose other %s end in %q, not in %q; rename it like them if it is the scan (%s has its row without it), or remove it",
		d.id, eem.Count(len(d.files), "file"), endingOf(d.files[0]), endingOf(odd[0]), d.id)
}

// byEnding tells the files with the ending that most of them have from the others.
func byEnding(files []string) (most, others []string) {
	n, top := map[string]int{}, ""
	for _, f := range files {
		e := endingOf(f)
		if n[e]++; n[e] > n[top] {
			top = e
		}
	}
	for _, f := range files {
		if endingOf(f) == top {
			most = append(most, f)
		} else {
			others = append(others, f)
		}
	}
	return most, others
}

// cell writes the files of a bottle as a scans cell: the file, the folder that holds
// nothing else, or a pattern.
func (b *beginning) cell(d *drafted) (string, bool) {
	if len(d.files) == 1 {
		if survey.PlainCell(d.files[0]) {
			return d.files[0], true
		}
		return b.exact(survey.PatternOf(d.files[0]), d.files)
	}
	if d.dir != "." {
		for _, cell := range []string{d.dir, survey.PatternOf(d.dir)} {
			if got, ok := b.exact(cell, d.files); ok {
				return got, true
			}
		}
	}
	first, last := d.files[0], d.files[len(d.files)-1] // in order: what these share all do
	i := 0
	for i < min(len(first), len(last)) && first[i] == last[i] {
		i++
	}
	head := strings.TrimRight(strings.ToValidUTF8(first[:i], ""), "0123456789.,")
	return b.exact(survey.PatternOf(head)+"*"+survey.PatternOf(endingOf(first)), d.files)
}

// exact says whether a cell names these files and no other.
func (b *beginning) exact(cell string, files []string) (string, bool) {
	if !survey.PlainCell(cell) {
		return "", false
	}
	got, err := prepare.Expand(b.root, cell)
	if err != nil || len(got) != len(files) {
		return "", false
	}
	for i := range got {
		if b.rel(got[i]) != files[i] {
			return "", false
		}
	}
	return cell, true
}
