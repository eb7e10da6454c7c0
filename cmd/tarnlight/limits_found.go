package main

import (
	"math"
	"slices"

	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix/merit"
)

// study holds what a survey says about limits by repeated measurements.
type study struct {
	j      *job
	k      int // of the resolution
	signed map[*prepare.Bottle][]float64
	groups [][]*prepare.Bottle // a bottle and its laboratory replicates
}

// studyOf gathers blanks, field blanks and standards of resolution k as least
// squares sees them.
func (j *job) studyOf(k int) *study {
	s := &study{j: j, k: k, signed: map[*prepare.Bottle][]float64{}}
	var bottles []*prepare.Bottle
	var rows []int
	for _, b := range j.sv.Bottles {
		if s.takesPart(b) && (b.Row.Kind == survey.Blank || b.Row.Kind == survey.FieldBlank || b.Row.Kind == survey.Standard) {
			bottles, rows = append(bottles, b), append(rows, j.row[b])
		}
	}
	for i, v := range merit.Signed(j.cube, j.res[k].Set, rows) {
		s.signed[bottles[i]] = v
	}
	s.group()
	return s
}

// group finds the bottles with replicates. One that was filled again is not among
// them: that scatter is not the method's.
func (s *study) group() {
	byID := map[string]*prepare.Bottle{}
	for _, b := range s.j.sv.Bottles {
		byID[b.Row.ID] = b
	}
	at := map[*prepare.Bottle]int{}
	for _, b := range s.j.sv.Bottles {
		root := b
		for root != nil && root.Row.ReplicateOf != "" {
			if root.Row.ReplicateKind == survey.Field {
				root = nil
				break
			}
			root = byID[root.Row.ReplicateOf]
		}
		if root == nil || !s.takesPart(b) || b.Undiluted() != root.Undiluted() {
			continue
		}
		i, ok := at[root]
		if !ok {
			i = len(s.groups)
			at[root] = i
			s.groups = append(s.groups, nil)
		}
		s.groups[i] = append(s.groups[i], b)
	}
	s.joinControls()
	s.groups = slices.DeleteFunc(s.groups, func(g []*prepare.Bottle) bool { return len(g) < 2 })
}

func (s *study) takesPart(b *prepare.Bottle) bool {
	i, ok := s.j.row[b]
	return ok && b.Usable() && b.Row.ExcludeFromFit == "" && s.j.res[s.k].Fits[i].Usable
}

// bases are the published forms for component f.
func (s *study) bases(f int) []merit.Basis {
	out := s.replicates(f)
	out = append(out, s.blanks(f)...)
	if b, ok := s.standards(f); ok {
		out = append(out, b)
	}
	return out
}

// batched sorts values into batches in their order of appearance.
type batched struct {
	names  []string
	values [][]float64
}

func (g *batched) add(batch string, v float64) {
	if v != v {
		return
	}
	i := slices.Index(g.names, batch)
	if i < 0 {
		i = len(g.names)
		g.names, g.values = append(g.names, batch), append(g.values, nil)
	}
	g.values[i] = append(g.values[i], v)
}

// blanks are those that were subtracted, by the mean that they are part of, and
// field blanks, which are handled like a sample.
func (s *study) blanks(f int) []merit.Basis {
	var own, field batched
	for _, b := range s.j.sv.Bottles {
		v, ok := s.signed[b]
		switch {
		case !ok:
		case b.Row.Kind == survey.Blank && b.BlankSet != "":
			own.add(b.BlankSet, v[f])
		case b.Row.Kind == survey.Blank:
			own.add(b.Batch, v[f])
		case b.Row.Kind == survey.FieldBlank:
			field.add(b.Batch, v[f])
		}
	}
	var out []merit.Basis
	if len(own.values) > 0 {
		in := math.MaxInt
		for _, v := range own.values {
			in = min(in, len(v))
		}
		out = append(out, merit.FromBlanks(basisBlanks, own.values, in)...)
	}
	if len(field.values) > 0 {
		out = append(out, merit.FromBlanks(basisFieldBlanks, field.values, 0)...)
	}
	return out
}

// standards are the levels given of component f.
func (s *study) standards(f int) (merit.Basis, bool) {
	name := s.j.res[s.k].Set.Components[f].Name
	var x, y []float64
	batches := map[string]bool{}
	for _, b := range s.j.sv.Bottles {
		v, ok := s.signed[b]
		at := slices.IndexFunc(b.Row.Conc, func(c survey.Conc) bool { return c.Name == name })
		if !ok || at < 0 || b.Row.Kind != survey.Standard || v[f] != v[f] {
			continue
		}
		x, y = append(x, b.Row.Conc[at].Value*b.Undiluted()), append(y, v[f])
		batches[b.Batch] = true
	}
	if len(x) == 0 {
		return merit.Basis{}, false
	}
	return merit.FromStandards(x, y, len(batches)), true
}

// replicates are the limits by the bottle and its replicates that suit best: not
// refused, and the lowest of those; else the one with most replicates.
func (s *study) replicates(f int) []merit.Basis {
	var best []merit.Basis
	better := func(a, b merit.Basis) bool {
		if (a.Refused == "") != (b.Refused == "") {
			return a.Refused == ""
		}
		if a.Refused == "" {
			return a.Mean < b.Mean
		}
		return a.N > b.N
	}
	for _, g := range s.groups {
		if b := s.judge(g, f); b != nil && (best == nil || better(b[0], best[0])) {
			best = b
		}
	}
	return best
}

// judge gives the limits by a group of replicates; nil where they are not meant to
// hold component f, or hold none.
func (s *study) judge(group []*prepare.Bottle, f int) []merit.Basis {
	of := group[0].Row
	name, n := s.j.res[s.k].Set.Components[f].Name, s.j.res[s.k].Set.Len()
	given := nan
	if at := slices.IndexFunc(of.Conc, func(c survey.Conc) bool { return c.Name == name }); at >= 0 && of.Kind != survey.Spike {
		given = of.Conc[at].Value * group[0].Undiluted()
	}
	known := of.Kind == survey.Standard || of.Kind == survey.Control
	if of.Kind == survey.Blank || of.Kind == survey.FieldBlank || known && !(given > 0) {
		return nil
	}
	var g batched
	made := false
	for _, b := range group {
		i := s.j.row[b]
		v := s.j.res[s.k].Value[i*n+f]
		if !known && !(v > s.j.judge[s.k].Spreads[i].Critical[f]) {
			return nil
		}
		g.add(b.Batch, v)
		made = made || s.j.calibrates(b)
	}
	out := merit.FromReplicates(basisOf(group), given, g.values)
	for i := range out {
		if made && out[i].Refused == "" {
			out[i].Refused = "they are part of the line of the standards, which follows them; give them the kind control"
		}
	}
	return out
}
