package synth

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io/fs"
	"iter"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"time"
)

// Write writes the survey folder: survey.toml, runsheet.csv, truth.csv (the
// invented truth, which no real survey has), correction/, absorbance/, scans/.
// Nothing is ever overwritten: a folder that holds anything must hold this very
// survey, of which missing files are completed. It panics when an ID cannot
// name a file.
func (s *Survey) Write(dir string) error {
	ours, err := s.isOurs(dir)
	if err != nil {
		return err
	}
	if !ours {
		return fmt.Errorf("%s is neither empty nor this invented survey; choose another folder", dir)
	}
	for f := range s.Files() {
		path := filepath.Join(dir, filepath.FromSlash(f.Path))
		switch have, err := os.ReadFile(path); {
		case err == nil && bytes.Equal(have, f.Data):
			continue
		case err == nil:
			return fmt.Errorf("%s differs from the invented survey; remove it or choose another folder", path)
		case !errors.Is(err, fs.ErrNotExist):
			return err
		}
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			return err
		}
		if err := os.WriteFile(path, f.Data, 0o644); err != nil {
			return err
		}
	}
	return nil
}

// isOurs says whether dir may be written to: it is not there, is empty, or
// holds the settings of this survey, which are written first.
func (s *Survey) isOurs(dir string) (bool, error) {
	entries, err := os.ReadDir(dir)
	if errors.Is(err, fs.ErrNotExist) || (err == nil && len(entries) == 0) {
		return true, nil
	}
	if err != nil {
		return false, err
	}
	have, err := os.ReadFile(filepath.Join(dir, "survey.toml"))
	if errors.Is(err, fs.ErrNotExist) {
		return false, nil
	}
	return bytes.Equal(have, s.settings()), err
}

// Files returns every file of the survey folder, one bottle in memory at a
// time. The order is fixed and survey.toml comes first.
func (s *Survey) Files() iter.Seq[File] {
	return func(yield func(File) bool) {
		head := []File{{"survey.toml", s.settings()}, {"runsheet.csv", s.sheet()}, {"truth.csv", s.truth()}}
		head = append(head, s.Instrument.factors("")...)
		for _, name := range slices.Sorted(maps.Keys(s.Setups)) {
			head = append(head, s.Setups[name].factors(name)...)
		}
		for _, f := range head {
			if !yield(f) {
				return
			}
		}
		for i, b := range s.Bottles {
			e, a := s.Raw(i)
			files := b.Layout.files(b.ID, e)
			if a != nil {
				csv := Layout{Delimiter: ","}
				files = append(files, File{absorbancePath(b), csv.spectrum("absorbance", a.Axis, a.A, 5)})
			}
			for _, f := range files {
				if !yield(f) {
					return
				}
			}
		}
	}
}

func absorbancePath(b Bottle) string {
	if b.NoAbsorbance {
		return ""
	}
	return "absorbance/" + b.ID + ".csv"
}

func (s *Survey) settings() []byte {
	var b bytes.Buffer
	b.WriteString("# An invented survey: nothing in this folder was measured. truth.csv says what its bottles hold.\n")
	fmt.Fprintf(&b, "title = %q\n", s.Title)
	s.Instrument.settings(&b, "")
	for _, name := range slices.Sorted(maps.Keys(s.Setups)) {
		s.Setups[name].settings(&b, name)
	}
	if s.Settings != "" {
		b.WriteString("\n" + s.Settings)
	}
	return b.Bytes()
}

// settings writes what must be known of an instrument, under the name of a
// setup, or for the whole survey when that is empty.
func (in *Instrument) settings(b *bytes.Buffer, setup string) {
	scans, correct := "[scans]\n", "\n[correct]\n"
	if setup != "" {
		scans, correct = fmt.Sprintf("[setup.%q]\n", setup), ""
	}
	fmt.Fprintf(b, "\n%ssaturation = %s\noffset = %s\n", scans, decimal(in.Saturation), decimal(in.Offset))
	fmt.Fprintf(b, "%sexcitation_factors = %q\nemission_factors = %q\n", correct, factorPath(setup, "excitation"), factorPath(setup, "emission"))
}

func factorPath(setup, axis string) string {
	if setup != "" {
		axis = setup + "-" + axis
	}
	return "correction/" + axis + ".csv"
}

// factors writes the correction factors at every nanometre, 5 nm beyond the
// grid, so that reading between them costs less than 1e-4.
func (in *Instrument) factors(setup string) []File {
	csv := Layout{Delimiter: ","}
	ex := steps(in.Ex.First()-5, in.Ex.Last()+5, 1)
	em := steps(in.Em.First()-5, in.Em.Last()+5, 1)
	return []File{
		{factorPath(setup, "excitation"), csv.spectrum("factor", ex, in.ExcitationFactors(ex), 6)},
		{factorPath(setup, "emission"), csv.spectrum("factor", em, in.EmissionFactors(em), 6)},
	}
}

func (s *Survey) truth() []byte {
	rows := [][]string{{"id", "component", "value", "unit"}}
	for _, t := range s.Truth() {
		rows = append(rows, []string{t.ID, t.Component, number(t.Value), t.Unit})
	}
	return table(rows)
}

func (s *Survey) sheet() []byte {
	head := []string{"id", "kind", "scans", "absorbance", "setup", "batch", "sampled", "measured", "site", "dilution",
		"replicate_of", "spike_of", "doc_mg_per_l", "temperature_c"}
	for _, f := range s.Components {
		head = append(head, "conc:"+f.Name+" ["+f.Unit+"]")
	}
	rows := [][]string{append(head, "remark")}
	for _, b := range s.Bottles {
		if strings.Trim(b.ID, "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-._") != "" {
			panic(fmt.Sprintf("synth: id %q cannot name a file", b.ID))
		}
		row := []string{b.ID, b.Kind, b.Layout.path(b.ID), absorbancePath(b), b.Setup, b.Batch, stamp(b.Sampled), stamp(b.Measured),
			b.Site, optional(b.Dilution), b.ReplicateOf, b.SpikeOf, optional(b.DOC), optional(b.TemperatureC)}
		for _, f := range s.Components {
			row = append(row, optional(Liquid{Doses: b.Known}.Amount(f)))
		}
		rows = append(rows, append(row, b.Remark))
	}
	return table(withoutEmpty(rows))
}

// withoutEmpty drops columns that no row uses.
func withoutEmpty(rows [][]string) [][]string {
	out := make([][]string, len(rows))
	for c := range rows[0] {
		used := false
		for _, r := range rows[1:] {
			used = used || r[c] != ""
		}
		for i, r := range rows {
			if used {
				out[i] = append(out[i], r[c])
			}
		}
	}
	return out
}

func table(rows [][]string) []byte {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	if err := w.WriteAll(rows); err != nil {
		panic(err) // a bytes.Buffer takes everything
	}
	return b.Bytes()
}

func decimal(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

func number(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

func optional(v float64) string {
	if v == 0 {
		return ""
	}
	return number(v)
}

func stamp(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return t.Format("2006-01-02T15:04")
}
