package main

import (
	"bytes"
	"encoding/json"
	"os"
	"path/filepath"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/report"
)

// findOld lists the bottles that the results which these replace hold already, of
// the same raw files and by the same model and settings: with --since-last the
// outcome does not speak of them again. After another model or other settings all
// are new.
func (j *job) findOld() {
	if !j.sinceLast {
		return
	}
	j.old = map[string]bool{}
	before, err := outdir.ReadProvenance(j.out)
	if err != nil || before.Version != version || !j.sameRules() {
		return
	}
	hash := map[string]string{}
	for _, f := range before.Inputs {
		hash[f.Path] = f.SHA256
	}
	t, err := report.ReadTable(filepath.Join(j.out, "samples.csv"))
	if err != nil || t.Col("id") < 0 {
		return
	}
	held := map[string]bool{}
	for i := range t.Rows {
		held[t.Text(i, t.Col("id"))] = true
	}
	for _, b := range j.sv.Bottles {
		same := held[b.Row.ID] && len(b.Files) > 0
		for _, f := range b.Files {
			same = same && hash[f.Path] == f.SHA256
		}
		j.old[b.Row.ID] = same || b.Excluded && held[b.Row.ID]
	}
}

// sameRules says whether the former results were made by this model and these
// settings.
func (j *job) sameRules() bool {
	model, err := json.MarshalIndent(j.applied, "", "  ")
	if err != nil {
		return false
	}
	var set bytes.Buffer
	if _, err := j.settingsUsed().WriteTo(&set); err != nil {
		return false
	}
	for name, want := range map[string][]byte{"model.json": append(model, '\n'), "settings-used.toml": set.Bytes()} {
		if have, err := os.ReadFile(filepath.Join(j.out, name)); err != nil || !bytes.Equal(have, want) {
			return false
		}
	}
	return true
}

// isNew says whether the outcome speaks of a finding: of one on old bottles alone it
// does not.
func (j *job) isNew(f eem.Flag) bool {
	if j.old == nil {
		return true
	}
	if f.ID != "" {
		return !j.old[f.ID]
	}
	if bt := j.sv.Find(f.Batch); f.Batch != "" && bt != nil {
		return j.anyNew(bt.Bottles)
	}
	return true
}

func (j *job) anyNew(bottles []*prepare.Bottle) bool {
	for _, b := range bottles {
		if !j.old[b.Row.ID] {
			return true
		}
	}
	return false
}

// news are the flags of which the outcome speaks.
func (j *job) news() []eem.Flag {
	if j.old == nil {
		return j.flags
	}
	var out []eem.Flag
	for _, f := range j.flags {
		if j.isNew(f) {
			out = append(out, f)
		}
	}
	return out
}
