package main

import (
	"strings"

	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
)

// withCells gives the bottles their cells.
func (b *beginning) withCells(list []*drafted) []*drafted {
	out := list[:0]
	for _, d := range list {
		var ok bool
		if d.scans, ok = b.cell(d); !ok {
			b.leaveOpen(d.files[0], "no scans cell can name it and its %d fellows and nothing else; rename them, or give them a folder of their own", len(d.files)-1)
			continue
		}
		out = append(out, d)
	}
	return out
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
