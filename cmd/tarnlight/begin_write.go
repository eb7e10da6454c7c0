package main

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"tarnlight/eem/survey"
)

// rowsOfDraft makes rows of bottles.
func rowsOfDraft(bottles []*drafted) []survey.Row {
	rows := make([]survey.Row, len(bottles))
	for i, d := range bottles {
		r := survey.NewRow()
		r.ID, r.Kind, r.Scans, r.Absorbance, r.ReplicateOf = d.id, d.kind, d.scans, d.absorbance, d.replicateOf
		r.Measured.Text = d.day
		r.Exclude = d.reason()
		if d.dilution > 0 {
			r.Dilution, r.AbsorbanceDilution = d.dilution, d.dilution
		}
		rows[i] = r
	}
	return rows
}

// writeDraft writes the sheet, and the settings where there are none.
func (b *beginning) writeDraft(bottles []*drafted, proposed string) (string, error) {
	sheet := &survey.Sheet{Columns: []string{"id", "kind", "scans", "absorbance", "measured", "site", "dilution", "replicate_of", "exclude"},
		Rows: rowsOfDraft(bottles)}
	if len(holding(bottles)) > 0 {
		sheet.Columns = append(sheet.Columns, survey.DraftConc)
	}
	name := filepath.Join(b.dir, "runsheet.xlsx")
	write := survey.WriteSheetXLSX
	if b.csv {
		name, write = filepath.Join(b.dir, "runsheet.csv"), survey.WriteSheetCSV
	}
	var buf bytes.Buffer
	if err := write(&buf, sheet); err != nil {
		return "", err
	}
	if err := writeNew(name, buf.Bytes()); err != nil {
		return "", err
	}
	settings := filepath.Join(b.dir, "survey.toml")
	if _, err := os.Lstat(settings); err == nil {
		return name, nil
	}
	return name, writeNew(settings, []byte(draftSettings(b.name, proposed)))
}

// replace puts data in the place of a file that still holds before: beside it
// first, then by a rename, so that there is the old file or the new one.
func replace(name string, before, data []byte) error {
	name, err := filepath.EvalSymlinks(name)
	if err != nil {
		return err
	}
	info, err := os.Stat(name)
	if err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(name), ".tarnlight-*")
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	err = errors.Join(err, f.Chmod(info.Mode().Perm()), f.Sync(), f.Close())
	if err == nil {
		if now, again := os.ReadFile(name); again != nil || !bytes.Equal(now, before) {
			err = fmt.Errorf("%s was changed while new rows were made for it; run again (nothing was touched)", name)
		} else {
			err = os.Rename(f.Name(), name)
		}
	}
	if err != nil {
		return errors.Join(err, os.Remove(f.Name()))
	}
	return nil
}

// draftSettings says nothing that is not a default, but the pattern of names where
// it was given; it shows where to begin.
func draftSettings(name, proposed string) string {
	naming := "# name = \"{date}_{kind}_{id}\"   # how begin reads file names\n"
	switch {
	case name != "":
		naming = fmt.Sprintf("name = %q\n", name)
	case proposed != "":
		naming = fmt.Sprintf("# name = %q   # all names here follow it; begin --add needs it\n", proposed)
	}
	return `# Settings of this survey. Every key has a default, so this file may be empty;
# tarnlight settings --list gives them all with their reasons.
title = ""

[sheet]
` + naming + `# kinds = {PW = "blank"}     # what the laboratory's own words in names stand for

[scans]
# saturation = 1000000     # counts at which the detector clips
# applied = []             # what was done to the files before they came here

[correct]
# excitation_factors = "correction/excitation.csv"
# emission_factors = "correction/emission.csv"

[resolve]
# components = "auto"      # or a number, a range such as [2, 7], or "off"
`
}
