package main

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"time"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/unmix/outdir"
)

// addNew appends rows for the files that no row names.
func (b *beginning) addNew(ctx context.Context) error {
	if b.name == "" {
		return b.needsName(ctx)
	}
	release, err := outdir.Hold(filepath.Join(b.dir, "runsheet.lock"))
	if err != nil {
		return err
	}
	return errors.Join(b.addHeld(ctx), release())
}

// needsName is the error of a survey without a pattern, with one that its names
// follow.
func (b *beginning) needsName(ctx context.Context) error {
	files, err := b.lookAround(ctx, nil)
	if err != nil {
		return err
	}
	example := b.propose(files)
	if example == "" {
		example = "{date}_{kind}_{id}"
	}
	return fmt.Errorf("%s: begin --add reads ids from file names and needs their pattern; write name = %q under [sheet] there, or what the names of the laboratory follow",
		filepath.Join(b.dir, "survey.toml"), example)
}

// present is the run sheet as it is.
type present struct {
	path  string // empty: there is none
	data  []byte
	sheet *survey.Sheet
}

func (b *beginning) readSheet() (*present, error) {
	path, err := survey.SheetPath(b.dir)
	if err != nil || path == "" {
		return &present{sheet: &survey.Sheet{}}, err
	}
	if err := outdir.OpenElsewhere(path); err != nil {
		return nil, err
	}
	p := &present{path: path}
	if p.data, err = scanfile.Load(path); err != nil {
		return nil, err
	}
	p.sheet, err = survey.ParseSheet(path, p.data, b.set)
	return p, err
}

func (b *beginning) addHeld(ctx context.Context) error {
	p, err := b.readSheet()
	if err != nil {
		return err
	}
	claims := prepare.Claims(b.root, p.sheet)
	for file, rows := range claims {
		if b.rel(file) != rows[0].Absorbance {
			b.scans[strings.TrimSuffix(b.rel(file), endingOf(file))] = true
			if rows[0].Exclude == "" { // else it may be what nobody can read
				b.endings[strings.ToLower(endingOf(file))] = true
			}
		}
	}
	files, err := b.lookAround(ctx, claims)
	if err != nil {
		return err
	}
	bottles := b.group(files)
	serve := b.assignAbsorbance(bottles, files)
	bottles = b.withCells(b.settled(bottles, serve))
	bottles = b.tellAside(b.withoutConc(b.distinct(bottles, p.sheet, claims)), p.sheet)
	b.tellLeft(files, serve)
	if err := ctx.Err(); err != nil {
		return err
	}
	if len(bottles) > 0 {
		b.lacking(p.sheet, placed(bottles))
		if err := b.append(p, bottles); err != nil {
			return err
		}
	}
	return b.outcome(p.path, bottles)
}

// outcome prints what was added and says how the run ended.
func (b *beginning) outcome(path string, bottles []*drafted) error {
	switch n := len(placed(bottles)); {
	case len(bottles) == 0:
		fmt.Fprintf(b.bar, "nothing new in %s\n", b.dir)
	case n > 0:
		if err := b.print(bottles); err != nil {
			return err
		}
		fmt.Fprintf(b.bar, "added to %s: %s\n", path, eem.Count(n, "row"))
	}
	if b.look {
		return &codeError{code: exitDoubt}
	}
	return nil
}

// append writes the rows behind those of the sheet, or a new sheet.
func (b *beginning) append(p *present, bottles []*drafted) error {
	if p.path == "" {
		var err error
		p.path, err = b.writeDraft(bottles, "")
		return err
	}
	out, err := survey.Append(p.path, p.data, b.set, rowsOfDraft(bottles))
	if rest := placed(bottles); err != nil && len(rest) < len(bottles) { // an odd name must not keep a night's bottles out
		why := err
		if len(rest) > 0 {
			out, err = survey.Append(p.path, p.data, b.set, rowsOfDraft(rest))
		}
		if err == nil || len(rest) == 0 {
			fmt.Fprintf(b.bar, "what was set aside could not be written, and is told again the next time: %v\n", why)
		}
		if len(rest) == 0 {
			return nil
		}
	}
	if err != nil {
		return err
	}
	return replace(p.path, p.data, out)
}

// settled leaves out bottles of which a file is younger than the settling time.
func (b *beginning) settled(bottles []*drafted, serve map[string]*found) []*drafted {
	return slices.DeleteFunc(bottles, func(d *drafted) bool {
		what, when := fmt.Sprintf("%s, first: %s", eem.Count(len(d.files), "file"), d.files[0]), d.youngest
		if f := serve[d.absorbance]; f != nil && f.written.After(when) {
			what, when = f.path, f.written
		}
		if b.young(when) {
			b.waits(fmt.Sprintf("%s (%s)", d.id, what), when)
			return true
		}
		return false
	})
}

func (b *beginning) young(written time.Time) bool { return b.now.Sub(written) < b.settle }

func (b *beginning) waits(what string, written time.Time) {
	age := b.now.Sub(written).Round(time.Second)
	when := fmt.Sprintf("written %v ago", age)
	if age < 0 {
		when = fmt.Sprintf("its time lies %v ahead of this machine's clock", -age)
	}
	fmt.Fprintf(b.bar, "waits for the next run: %s, %s; files settle for %v\n", what, when, b.settle)
}

// withoutConc sets bottles aside whose row needs what no name tells; with such a row
// the whole sheet could not be read.
func (b *beginning) withoutConc(bottles []*drafted) []*drafted {
	for _, d := range bottles {
		switch d.kind {
		case survey.Standard, survey.Control, survey.Spike:
			if d.aside == "" {
				d.aside = fmt.Sprintf("%s is a %s, and no name tells how much it holds", d.id, d.kind)
				d.unknownConc = true
			}
		}
	}
	return bottles
}

// lacking tells which columns the sheet lacks for what the names say.
func (b *beginning) lacking(sheet *survey.Sheet, bottles []*drafted) {
	has := func(name string) bool {
		return len(sheet.Columns) == 0 || slices.ContainsFunc(sheet.Columns, func(c string) bool { return strings.EqualFold(c, name) })
	}
	for _, c := range []struct {
		name string
		of   func(*drafted) string
	}{
		{"absorbance", func(d *drafted) string { return d.absorbance }},
		{"measured", func(d *drafted) string { return d.day }},
		{"dilution", func(d *drafted) string {
			if d.dilution <= 1 {
				return ""
			}
			return strconv.FormatFloat(d.dilution, 'g', -1, 64)
		}},
		{"replicate_of", func(d *drafted) string { return d.replicateOf }},
	} {
		if i := slices.IndexFunc(bottles, func(d *drafted) bool { return c.of(d) != "" }); i >= 0 && !has(c.name) {
			fmt.Fprintf(b.bar, "the sheet has no column %s, so that %s of %s was not written; add the column\n", c.name, c.of(bottles[i]), bottles[i].id)
			b.look = true
		}
	}
}
