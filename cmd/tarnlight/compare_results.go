package main

import (
	"bytes"
	"cmp"
	"fmt"
	"maps"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/report"
)

// contributionKey names a row of contributions.csv.
type contributionKey struct{ id, component, method string }

// contributed is what compare looks at of it.
type contributed struct {
	value     float64
	qualifier string
}

func contributionsOf(dir string) (map[contributionKey]contributed, error) {
	t, err := report.ReadTable(filepath.Join(dir, "contributions.csv"))
	if err != nil {
		return nil, err
	}
	out := map[contributionKey]contributed{}
	for r := range t.Rows {
		k := contributionKey{t.Text(r, t.Col("id")), t.Text(r, t.Col("component")), t.Text(r, t.Col("method"))}
		out[k] = contributed{t.Float(r, t.Col("value")), t.Text(r, t.Col("qualifier"))}
	}
	return out, nil
}

func (c contributed) show(in bool) string {
	switch {
	case !in:
		return "absent"
	case math.IsNaN(c.value):
		return strings.TrimSpace("none " + c.qualifier)
	}
	return strings.TrimSpace(report.Number(c.value) + " " + c.qualifier)
}

// compareResults lists the contributions that differ.
func compareResults(s streams, o compareOptions) error {
	a, err := contributionsOf(o.a)
	if err != nil {
		return err
	}
	b, err := contributionsOf(o.b)
	if err != nil {
		return err
	}
	all := maps.Clone(a)
	maps.Copy(all, b)
	keys := slices.SortedFunc(maps.Keys(all), func(x, y contributionKey) int {
		return cmp.Or(strings.Compare(x.id, y.id), strings.Compare(x.component, y.component), strings.Compare(x.method, y.method))
	})
	t := newText("id", "component", "method", "a", "b", "relative difference")
	for _, k := range keys {
		x, inA := a[k]
		y, inB := b[k]
		d := relative(x.value, y.value)
		if inA && inB && x.qualifier == y.qualifier && (d <= o.tolerance || math.IsNaN(x.value) && math.IsNaN(y.value)) {
			continue
		}
		t.add(k.id, k.component, k.method, x.show(inA), y.show(inB), fmt.Sprintf("%.3g", d))
	}
	for _, line := range behind(o.a, o.b) {
		fmt.Fprintln(s.err, line)
	}
	fmt.Fprintf(s.err, "%d of %s differ by more than %g, or in their qualifier\n", len(t.rows), eem.Count(len(keys), "contribution"), o.tolerance)
	if len(t.rows) == 0 {
		return nil
	}
	if err := t.print(s.out); err != nil {
		return err
	}
	return &codeError{code: exitDoubt}
}

// behind lists what may lie behind a difference of two results: version, settings,
// inputs. What cannot be read is passed over; the contributions alone decide.
func behind(a, b string) (lines []string) {
	pa, errA := outdir.ReadProvenance(a)
	pb, errB := outdir.ReadProvenance(b)
	if errA == nil && errB == nil {
		if pa.Version != pb.Version {
			lines = append(lines, fmt.Sprintf("version: %s, %s", pa.Version, pb.Version))
		}
		if list := inputsThatDiffer(pa.Inputs, pb.Inputs); len(list) > 0 {
			lines = append(lines, fmt.Sprintf("%s of another content, or of one side only: %s", eem.Count(len(list), "input"), some(list)))
		}
	}
	sa, errA := settingLines(a)
	sb, errB := settingLines(b)
	if errA == nil && errB == nil {
		for _, k := range slices.Sorted(maps.Keys(sa)) {
			if sa[k] != sb[k] {
				lines = append(lines, fmt.Sprintf("setting %s: %s, %s", k, sa[k], cmp.Or(sb[k], "absent")))
			}
		}
	}
	return lines
}

func inputsThatDiffer(a, b []outdir.File) []string {
	sum := map[string]string{}
	for _, f := range a {
		sum[f.Path] = f.SHA256
	}
	var out []string
	for _, f := range b {
		if sum[f.Path] != f.SHA256 {
			out = append(out, f.Path)
		}
		delete(sum, f.Path)
	}
	out = append(out, slices.Collect(maps.Keys(sum))...)
	slices.Sort(out)
	return out
}

// settingLines are the settings of a results folder, by key, as this version would
// write them.
func settingLines(dir string) (map[string]string, error) {
	set, err := survey.ReadSettings(filepath.Join(dir, "settings-used.toml"))
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if _, err := set.WriteTo(&b); err != nil {
		return nil, err
	}
	out := map[string]string{}
	table := ""
	for line := range strings.Lines(b.String()) {
		line = strings.TrimSpace(line)
		if name, value, ok := strings.Cut(line, " = "); ok {
			out[strings.TrimPrefix(table+"."+name, ".")] = value
		} else if strings.HasPrefix(line, "[") {
			table = strings.Trim(line, "[]")
		}
	}
	return out, nil
}
