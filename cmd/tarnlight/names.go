package main

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
)

// same is the congruence, in both modes, above which two spectra are one
// component (Lorenzo-Seva & ten Berge 2006, Methodology 2, 57).
const same = 0.95

// keepNames gives the components of a fit the names that they had in the results
// which these replace, and says what became of the former ones. Components are
// numbered once: a new one gets a number that was never used.
func (j *job) keepNames(s *unmix.Set) {
	data, err := os.ReadFile(filepath.Join(j.out, "model.json"))
	if err != nil {
		return // no former model
	}
	m, err := unmix.ParseModel("model.json", data)
	if err != nil || m.Method != "parafac" {
		return
	}
	former := m.Set()
	g, err := common(s.Grid, former.Grid)
	if err != nil {
		return
	}
	now, was := spectraOn(s, g), spectraOn(former, g)
	names := make([]string, s.Len())
	taken := former.Names()
	kept := map[string]bool{}
	for _, p := range parafac.Match(now.ex, now.em, was.ex, was.em) {
		if p.B >= 0 && p.Ex > same && p.Em > same {
			names[p.A] = former.Components[p.B].Name
			kept[names[p.A]] = true
		}
	}
	var fresh, gone []string
	for f := range names {
		if names[f] == "" {
			names[f] = unused(taken, former.Len())
			taken = append(taken, names[f])
			fresh = append(fresh, names[f])
		}
		s.Components[f].Name = names[f]
	}
	for _, n := range former.Names() {
		if !kept[n] {
			gone = append(gone, n)
		}
	}
	if len(fresh)+len(gone) == 0 {
		return
	}
	msg := "held against the former results"
	if len(gone) > 0 {
		msg += ", no component is any more: " + strings.Join(gone, ", ")
	}
	if len(fresh) > 0 {
		msg += "; new: " + strings.Join(fresh, ", ")
	}
	j.flags = append(j.flags, j.sv.Accept(eem.Flag{Method: "parafac", Test: "components-changed", Severity: eem.Remark, Value: nan, Limit: nan, Msg: msg}))
}

// unused returns the first C-number behind the former ones that is not taken: a
// number whose component was renamed is not given to another.
func unused(taken []string, former int) string {
	for n := former + 1; ; n++ {
		if name := fmt.Sprintf("C%d", n); !slices.Contains(taken, name) {
			return name
		}
	}
}
