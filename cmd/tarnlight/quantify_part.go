package main

import (
	"fmt"
	"path/filepath"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/scanfile"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// hasStandards says whether the sheet can build references.
func (j *job) hasStandards() bool {
	return slices.ContainsFunc(j.sv.Bottles, func(b *prepare.Bottle) bool { return j.calibrates(b) && len(b.Row.Conc) > 0 })
}

// calibrates says whether a bottle takes part in references.
func (j *job) calibrates(b *prepare.Bottle) bool {
	return b.Row.Kind == survey.Standard && !b.Excluded && b.Row.ExcludeFromFit == ""
}

// quantifyPart resolves against references, where there are any.
func (j *job) quantifyPart() error {
	how := j.set.Quantify.References
	if !j.quantify || how == "none" || (how == "auto" && !j.hasStandards()) {
		return nil
	}
	var set *unmix.Set
	var err error
	if how == "file" {
		set, err = readReferences(filepath.Join(j.dir, filepath.FromSlash(j.set.Quantify.File)), j.set.Quantify.File)
	} else {
		set, err = j.references()
	}
	if err != nil {
		return err
	}
	j.flags = append(j.flags, j.lineFlags()...)
	j.flags = append(j.flags, j.levelFlags(set)...)
	return j.resolveWith(set, "references", nil)
}

// references builds the set from the sheet's standards.
func (j *job) references() (*unmix.Set, error) {
	var names, units []string
	var standards []unmix.Standard
	for _, b := range j.sv.Bottles {
		if !j.calibrates(b) || !b.Usable() {
			continue
		}
		st := unmix.Standard{ID: b.Row.ID, Batch: b.Batch, Conc: map[string]float64{}}
		st.EEM = eem.FromCells(j.cube.Grid, j.cube.Unit, j.cube.Sample(j.row[b]))
		copy(st.EEM.Why, j.cube.SampleWhy(j.row[b]))
		for _, c := range b.Row.Conc {
			if !slices.Contains(names, c.Name) {
				names, units = append(names, c.Name), append(units, c.Unit)
			}
			st.Conc[c.Name] = c.Value * b.Undiluted() // of the bottle, like the corrected EEM
		}
		standards = append(standards, st)
	}
	set, lines, err := unmix.FromStandards(j.cube.Grid, j.cube.Unit, names, units, standards)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", j.sheet.Path, err)
	}
	j.lines = lines
	j.refs = &merit.References{Weights: unmix.WeightsOf(j.cube.Grid, names, standards)}
	for _, b := range j.sv.Bottles {
		if j.calibrates(b) && b.Usable() {
			j.refs.Row = append(j.refs.Row, j.row[b])
		}
	}
	for _, st := range standards {
		given := make([]float64, len(names))
		for f, name := range names {
			given[f] = st.Conc[name]
		}
		j.refs.Given = append(j.refs.Given, given)
	}
	return set, nil
}

// readReferences reads a reference file or a model file.
func readReferences(path, name string) (*unmix.Set, error) {
	if filepath.Ext(path) == ".json" {
		data, err := scanfile.Load(path)
		if err != nil {
			return nil, err
		}
		m, err := unmix.ParseModel(name, data)
		if err != nil {
			return nil, err
		}
		s := m.Set()
		s.Origin = name
		return s, nil
	}
	t, err := scanfile.ReadTable(path)
	if err != nil {
		return nil, err
	}
	rows := make([][]string, len(t.Rows))
	line := make([]int, len(t.Rows))
	for i, r := range t.Rows {
		rows[i], line[i] = r.Cells, r.Line
	}
	return unmix.ParseComponents(name, t.Header, rows, line)
}
