package main

import (
	"bytes"
	"encoding/json"
	"maps"
	"math"
	"os"
	"path/filepath"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/report"
)

// stageDir is the folder that takes the staged files.
func stageDir(s *outdir.Staging) string { return filepath.Dir(s.Path(report.StoreName)) }

// write stages every result file but those that report.Render makes.
func (j *job) write(stage *outdir.Staging) error {
	dir := stageDir(stage)
	for _, t := range []*report.Table{
		j.contributionTable(), j.sampleTable(), j.flagTable(), j.componentTable(), j.modelTable(), j.splitTable(),
		j.splitSpectra(), j.batchTable(), j.calibrationTable(), j.chartTable(), j.blankTable(), j.budgetTable(), j.stepTable(), j.limitsTable(), j.testTable(),
	} {
		if err := t.WriteFile(dir); err != nil {
			return err
		}
	}
	if err := j.writeStore(stage.Path(report.StoreName)); err != nil {
		return err
	}
	if err := j.writeModel(stage.Path("model.json")); err != nil {
		return err
	}
	f, err := os.Create(stage.Path("settings-used.toml"))
	if err != nil {
		return err
	}
	_, err = j.settingsUsed().WriteTo(f)
	if cerr := f.Close(); err == nil {
		err = cerr
	}
	if err != nil {
		return err
	}
	return writeJSON(stage.Path("status.json"), j.status())
}

func writeJSON(path string, v any) error {
	b, err := json.MarshalIndent(v, "", "  ")
	if err != nil {
		return err
	}
	return os.WriteFile(path, append(b, '\n'), 0o644)
}

// settingsUsed are the settings with what was found for "auto".
func (j *job) settingsUsed() *survey.Settings {
	s := *j.sv.Settings
	if name, ok := map[eem.Unit]string{eem.Raman: "raman", eem.Quinine: "quinine", eem.Counts: "counts"}[j.sv.Unit]; ok && s.Intensity.Unit == "auto" {
		s.Intensity.Unit = name
	}
	return &s
}

// writeStore writes survey.nc bottle by bottle.
func (j *job) writeStore(path string) error {
	set := report.StoreSettings{Grid: j.cube.Grid, Unit: j.cube.Unit, Title: j.set.Title}
	var bottles []*prepare.Bottle
	for _, b := range j.sv.Bottles {
		if !b.Excluded {
			bottles = append(bottles, b)
			set.IDs = append(set.IDs, b.Row.ID)
		}
	}
	for _, r := range j.res {
		set.Methods = append(set.Methods, r.Set.Method)
	}
	w, err := report.CreateStore(path, set)
	if err != nil {
		return err
	}
	n := j.cube.Cells()
	residual := map[string][]float64{}
	for _, r := range j.res {
		residual[r.Set.Method] = make([]float64, n)
	}
	for _, b := range bottles {
		i, ok := j.row[b]
		if !ok {
			if err := w.Append(b.Row.ID, nil, nil, nil, nil); err != nil {
				return err
			}
			continue
		}
		for _, r := range j.res {
			r.ResidualTo(residual[r.Set.Method], j.cube.Sample(i), i)
		}
		if err := w.Append(b.Row.ID, j.cube.Sample(i), j.cube.SampleU(i), residual, j.cube.SampleWhy(i)); err != nil {
			return err
		}
	}
	return w.Close()
}

// writeModel freezes the chosen model, or the references where nothing was
// resolved.
func (j *job) writeModel(path string) error {
	if j.applied != nil {
		return writeJSON(path, j.applied)
	}
	r := j.res[len(j.res)-1]
	m := unmix.NewModel(r.Set, j.set.Title)
	m.Corrections = j.corrections()
	var used bytes.Buffer
	if _, err := j.settingsUsed().WriteTo(&used); err != nil {
		return err
	}
	m.Settings = used.String()
	m.Instrument = j.ownInstrument()
	if j.fit != nil {
		m.Samples = j.fit.IDs
		if e := j.fit.Explained; !math.IsNaN(e) {
			m.Explained = &e
		}
	}
	j.describe(m, r)
	m.Errors = merit.SpectraErrors(j.cube, r, j.src[len(j.src)-1], m.Cells)
	return writeJSON(path, m)
}

// describe adds what the model's own bottles look like, and which cells it saw.
func (j *job) describe(m *unmix.Model, r *unmix.Resolution) {
	seen := make([]bool, j.cube.Cells())
	var value, left []float64
	for _, b := range j.sv.Bottles {
		if !inFit(b) {
			continue
		}
		i := j.row[b]
		for c, why := range j.cube.SampleWhy(i) {
			seen[c] = seen[c] || why == eem.Measured
		}
		if fit := r.Fits[i]; fit.Usable && !math.IsNaN(fit.Explained) {
			value = append(value, r.Value[i*r.Set.Len():(i+1)*r.Set.Len()]...)
			left = append(left, 1-fit.Explained/100)
		}
	}
	_, cells := r.Set.Matrix()
	for _, c := range cells {
		if seen[c] {
			m.Cells = append(m.Cells, c)
		}
	}
	if l, err := unmix.NewLikeness(value, r.Set.Len(), left, 0.01); err == nil {
		m.Likeness = l
	}
	if n := len(j.yards); n > 0 && j.yards[n-1] != nil && j.yards[n-1].Pairs > 0 {
		m.Yardstick = j.yards[n-1]
	}
}

// corrections lists the steps that the intensities have behind them, here or
// before they came here, in order.
func (j *job) corrections() []string {
	done := map[string]bool{}
	for _, b := range j.sv.Bottles {
		if !b.Usable() || b.Row.Kind == survey.Blank {
			continue
		}
		for _, step := range b.Setting.Scans.Applied {
			done[step] = true
		}
		c := b.Setting.Correct
		for step, does := range map[string]bool{"spectral": c.ExcitationFactors != "" || c.EmissionFactors != "",
			"inner-filter": c.InnerFilter != "none", "blank": c.Blank != "none"} {
			done[step] = done[step] || does && !slices.Contains(c.Off, step)
		}
	}
	out := []string{}
	for _, step := range []string{"spectral", "inner-filter", "blank"} {
		if done[step] {
			out = append(out, step)
		}
	}
	return out
}

func (j *job) status() status {
	s := status{Outcome: "done", Version: version, Title: j.set.Title, Unit: string(j.cube.Unit), Methods: []string{},
		Bottles:  map[string]int{"all": len(j.sv.Bottles), "usable": 0, "rejected": 0, "excluded": 0},
		Findings: map[string]int{"notes": 0, "doubts": 0, "rejects": 0}, Tests: map[string]int{}, Rejected: []string{}, Reasons: []string{}, SinceLast: j.old != nil}
	for _, r := range j.res {
		s.Methods = append(s.Methods, r.Set.Method)
	}
	s.countBottles(j)
	news := j.news()
	s.Concerns = concerned(news)
	for _, f := range news {
		s.Findings[[...]string{"notes", "notes", "doubts", "rejects"}[f.Severity]]++
		if f.Severity >= eem.Doubt {
			s.Tests[f.Test]++
		}
	}
	s.ReasonGroups = reasonsOf(j.worst())
	for _, r := range s.ReasonGroups[:min(len(s.ReasonGroups), 10)] {
		s.Reasons = append(s.Reasons, r.line())
	}
	if s.Findings["doubts"]+s.Findings["rejects"] > 0 {
		s.Outcome, s.ExitCode = "doubt", exitDoubt
		if j.strict && len(s.Rejected) > 0 {
			s.ExitCode = exitFailed
		}
	}
	return s
}

// collectFlags puts all findings into one list: what reading and correcting
// found, then each method's, then the fit's and the batch checks.
func (j *job) collectFlags() {
	own := j.flags
	j.flags = slices.Clone(j.sv.Flags)
	for _, judged := range j.judge {
		j.flags = append(j.flags, judged.Flags...)
	}
	j.flags = append(j.flags, own...)
	for k := range j.res {
		j.flags = append(j.flags, j.qualityFlags(k)...)
	}
	j.flags = append(j.flags, j.limitsLowFlags()...)
	j.flags = append(j.flags, j.chartFlags()...)
	j.flags = append(j.flags, j.opticsFlags()...)
	j.flags = append(j.flags, j.alertFlags()...)
}

// provenance lists what the results rest on.
func (j *job) provenance() outdir.Provenance {
	p := outdir.Provenance{Version: version, Verb: j.verb, Steps: prepare.Steps}
	for _, in := range j.sv.Inputs {
		p.Inputs = append(p.Inputs, outdir.File{Path: in.Path, SHA256: in.SHA256, Size: in.Size})
	}
	extra := map[string]bool{j.sheet.Path: true, j.settingsPath(): true}
	for _, name := range []string{j.set.Sheet.Exclusions, j.set.Resolve.Hold, j.set.Quantify.File, j.set.Quantify.Limits} {
		if path := filepath.FromSlash(name); filepath.IsAbs(path) {
			extra[path] = true
		} else if name != "" {
			extra[filepath.Join(j.dir, path)] = true
		}
	}
	if j.model != "" {
		extra[j.model] = true
	}
	for _, path := range slices.Sorted(maps.Keys(extra)) {
		if f, err := outdir.HashUnder(j.dir, path); err == nil {
			p.Inputs = append(p.Inputs, f)
		}
	}
	return p
}

func (j *job) settingsPath() string {
	if j.settings != "" {
		return j.settings
	}
	return filepath.Join(j.dir, "survey.toml")
}
