package main

import (
	"context"
	"fmt"
	"path/filepath"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
)

type beginOptions struct {
	dir    string
	csv    bool
	name   string // pattern of file names; empty: that of the settings
	add    bool
	settle time.Duration
	now    time.Time
}

// newBeginCmd drafts run sheet and settings.
func newBeginCmd(s streams) *cobra.Command {
	var o beginOptions
	c := &cobra.Command{
		Use:   "begin DIR",
		Short: "Drafts run sheet and settings from a folder of raw files; --add appends new ones",
		Long: `begin looks at every file below DIR, tells scans from absorbance by content, groups
scans into bottles by their names, and drafts runsheet.xlsx (or runsheet.csv with
--csv) and survey.toml. What is there already is never touched. Read the draft:
concentrations are known to you alone.

Names tell more where they follow a pattern, given with --name or as name under
[sheet] in survey.toml: {id}, {kind}, {date}, {n} (a repetition), {dilution},
{nm} (an excitation) and * (anything), such as "{date}_{kind}_{id}_ex{nm}" or
"{date}/{id}". [sheet] kinds says what the laboratory's own words stand for,
kinds = {PW = "blank"}.

With --add, as in a nightly job, rows for files that no row names yet are appended to
the run sheet by that pattern. Nothing is asked and no row that is there changes.
Files younger than --settle wait for the next run, in case they are still being
written. What cannot be placed (a name that the pattern does not fit, one that it fits on
a file nobody can read, a standard whose concentrations no name tells) is told once: it gets a row with the reason under
exclude, which takes part in nothing until somebody corrects the row and empties that
cell. [sheet] ignore in survey.toml, as ["*.pdf", "old"], names what begin passes over.
Exit codes: 0 rows added or nothing new, 3 something was set aside that somebody must
look at, 1 failed.`,
		Example: "  tarnlight begin mysurvey\n  tarnlight begin mysurvey --csv --name {id}\n  tarnlight begin mysurvey --add",
		Args:    cobra.ExactArgs(1),
	}
	f := c.Flags()
	f.BoolVar(&o.csv, "csv", false, "write runsheet.csv instead of runsheet.xlsx")
	f.StringVar(&o.name, "name", "", "pattern by which file names are read (default: [sheet] name)")
	f.BoolVar(&o.add, "add", false, "append rows for new files to the run sheet")
	f.DurationVar(&o.settle, "settle", 2*time.Minute, "with --add: how long ago a file must have been written last")
	c.RunE = func(c *cobra.Command, args []string) error {
		o.dir, o.now = args[0], time.Now()
		return o.run(c.Context(), s)
	}
	return c
}

func (o beginOptions) run(ctx context.Context, s streams) error {
	if err := surveyFolder(o.dir); err != nil {
		return err
	}
	set, err := survey.ReadSettings(filepath.Join(o.dir, "survey.toml"))
	if err != nil {
		return err
	}
	if o.name == "" {
		o.name = set.Sheet.Name
	}
	if o.name != "" {
		p, err := scanfile.CompilePattern(o.name)
		if err != nil {
			return err
		}
		if !p.Has("id") {
			return fmt.Errorf("pattern %q: {id} is missing; write it where the bottle's name stands", o.name)
		}
	}
	b := &beginning{beginOptions: o, streams: s, set: set, root: prepare.Root(o.dir, set), bar: newBar(s.err), told: map[string]bool{}, endings: map[string]bool{}, scans: map[string]bool{}}
	if o.add {
		return b.addNew(ctx)
	}
	return b.draft(ctx)
}

// beginning is one run of begin.
type beginning struct {
	beginOptions
	streams streams
	set     *survey.Settings
	root    string // the raw files lie below it
	bar     *bar
	look    bool            // a file was left out that somebody must look at
	told    map[string]bool // files that belong to a bottle though their content does not say so, or of which all was said
	endings map[string]bool // that scans have
	scans   map[string]bool // paths of scans without their ending
	passed  int             // files and folders that the settings name to be passed over
}

// leave says that a file is not used and why.
func (b *beginning) leave(name, why string) { fmt.Fprintf(b.bar, "not used: %s: %s\n", name, why) }

// leaveOpen says so of a file that somebody must look at.
func (b *beginning) leaveOpen(name, format string, args ...any) {
	b.leave(name, fmt.Sprintf(format, args...))
	b.look = true
}

// draft writes a run sheet where there is none.
func (b *beginning) draft(ctx context.Context) error {
	switch path, err := survey.SheetPath(b.dir); {
	case err != nil:
		return err
	case path != "":
		return fmt.Errorf("%s is there already and is not touched; tarnlight begin %s --add appends rows for new files, or move it away to draft a new one", path, b.dir)
	}
	files, err := b.lookAround(ctx, nil)
	if err != nil {
		return err
	}
	bottles := b.withCells(b.group(files))
	if b.name == "" {
		folderNames(bottles, b.set.Sheet.Kinds)
		bottles = byPath(bottles)
		asideNamesakes(bottles)
	} else {
		bottles = b.distinct(bottles, &survey.Sheet{}, nil)
	}
	serve := b.assignAbsorbance(bottles, files)
	b.tellLeft(files, serve)
	if len(placed(bottles)) == 0 {
		return fmt.Errorf("%s: no file below it looks like a scan%s (%d looked at); put the exported scans there, or state their form under [scans] in survey.toml",
			b.root, map[bool]string{true: " whose name follows " + b.name}[b.name != ""], len(files))
	}
	bottles = b.tellAside(bottles, &survey.Sheet{})
	return b.finishDraft(bottles, files)
}

// finishDraft writes the draft and says what to do next.
func (b *beginning) finishDraft(bottles []*drafted, files []found) error {
	proposed := ""
	if b.name == "" {
		proposed = b.propose(files)
	}
	name, err := b.writeDraft(bottles, proposed)
	if err != nil {
		return err
	}
	if err := b.print(bottles); err != nil {
		return err
	}
	fmt.Fprintf(b.bar, "drafted: %s\n", name)
	b.tellConc(bottles)
	if proposed != "" {
		fmt.Fprintf(b.bar, "the names follow %s; as name under [sheet] in survey.toml it lets begin --add append new files\n", proposed)
	}
	fmt.Fprintf(b.bar, "next: set kinds, dates and concentrations there, then tarnlight check %s\n", b.dir)
	return nil
}

// print lists the bottles on standard output.
func (b *beginning) print(bottles []*drafted) error {
	t := newText("id", "kind", "scans", "files", "absorbance")
	for _, d := range placed(bottles) {
		t.add(d.id, string(d.kind), d.scans, fmt.Sprint(len(d.files)), d.absorbance)
	}
	return t.print(b.streams.out)
}

// own says whether a file of a survey folder is none of its raw files by name.
func own(rel string) bool {
	if strings.Contains(rel, "/") {
		return false
	}
	return strings.HasPrefix(rel, "runsheet.") || rel == "survey.toml" || strings.HasPrefix(rel, "README") || rel == "truth.csv"
}
