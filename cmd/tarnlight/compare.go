package main

import (
	"fmt"
	"math"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"
	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
)

type compareOptions struct {
	a, b      string
	tolerance float64
	json      bool
}

// newCompareCmd holds two models or two results against each other.
func newCompareCmd(s streams) *cobra.Command {
	var o compareOptions
	c := &cobra.Command{
		Use:   "compare A B",
		Short: "Two models or spectra files: which component is which; two results: what changed",
		Long: `compare pairs the components of two model files (model.json) or spectra files (the
layout of components.csv) by the congruence of both spectra, over the wavelengths
that both have, and tells how far the peaks lie apart. Congruences above 0.95 in
both modes mean the same spectrum (Lorenzo-Seva & ten Berge 2006).

Given two results folders it lists the contributions that differ by more than the
tolerance, relative, or have another qualifier, and exits with 3 where there are any.
What may lie behind it goes to standard error: another version, settings and inputs
that differ. tarnlight run --settings OUT/settings-used.toml --out AGAIN repeats a
result under a later version.`,
		Example: "  tarnlight compare lastyear/out/model.json thisyear/out/model.json\n  tarnlight compare mysurvey/out mysurvey/out.previous --tolerance 0.01",
		Args:    cobra.ExactArgs(2),
	}
	c.Flags().Float64Var(&o.tolerance, "tolerance", 1e-9, "relative difference of contributions that counts as none")
	c.Flags().BoolVar(&o.json, "json", false, "as JSON")
	c.RunE = func(_ *cobra.Command, args []string) error {
		o.a, o.b = args[0], args[1]
		return runCompare(s, o)
	}
	return c
}

func runCompare(s streams, o compareOptions) error {
	ia, errA := os.Stat(o.a)
	ib, errB := os.Stat(o.b)
	switch {
	case errA != nil:
		return errA
	case errB != nil:
		return errB
	case ia.IsDir() != ib.IsDir():
		return misuse("%s and %s: give two folders of results, or two files of spectra", o.a, o.b)
	case ia.IsDir():
		for _, dir := range []string{o.a, o.b} {
			if _, err := os.Stat(filepath.Join(dir, "contributions.csv")); err != nil {
				if err := resultsFolder(dir); err != nil {
					return err
				}
			}
		}
		return compareResults(s, o)
	}
	return compareSpectra(s, o)
}

// match is how one component of A fits its partner in B.
type match struct {
	A, B               string
	Ex, Em             float64    // congruence over the common wavelengths
	ExShift, EmShift   float64    // nm, peak of B less peak of A
	SharedEx, SharedEm [2]float64 // nm
}

func compareSpectra(s streams, o compareOptions) error {
	a, err := readReferences(o.a, o.a)
	if err != nil {
		return err
	}
	b, err := readReferences(o.b, o.b)
	if err != nil {
		return err
	}
	g, err := common(a.Grid, b.Grid)
	if err != nil {
		return fmt.Errorf("%s and %s: %w", o.a, o.b, err)
	}
	on, other := spectraOn(a, g), spectraOn(b, g)
	var list []match
	for _, p := range parafac.Match(on.ex, on.em, other.ex, other.em) {
		m := match{A: a.Components[p.A].Name, Ex: p.Ex, Em: p.Em}
		if p.B >= 0 {
			m.B = b.Components[p.B].Name
			m.ExShift = peak(g.Ex, other.ex[p.B]) - peak(g.Ex, on.ex[p.A])
			m.EmShift = peak(g.Em, other.em[p.B]) - peak(g.Em, on.em[p.A])
		}
		m.SharedEx, m.SharedEm = [2]float64{g.Ex.First(), g.Ex.Last()}, [2]float64{g.Em.First(), g.Em.Last()}
		list = append(list, m)
	}
	if o.json {
		return printJSON(s.out, list)
	}
	t := newText(filepath.Base(o.a), filepath.Base(o.b), "congruence ex", "congruence em", "ex peak shift nm", "em peak shift nm", "verdict")
	for _, m := range list {
		if m.B == "" {
			t.add(m.A, "-", "", "", "", "", "no partner")
			continue
		}
		verdict := "another"
		switch least := min(m.Ex, m.Em); {
		case least > 0.95:
			verdict = "the same"
		case least >= 0.85:
			verdict = "similar"
		}
		t.add(m.A, m.B, fmt.Sprintf("%.4f", m.Ex), fmt.Sprintf("%.4f", m.Em), fmt.Sprintf("%+.1f", m.ExShift), fmt.Sprintf("%+.1f", m.EmShift), verdict)
	}
	fmt.Fprintf(s.err, "compared over %s\n", g)
	return t.print(s.out)
}

// common returns the points of a that b covers too.
func common(a, b eem.Grid) (eem.Grid, error) {
	ex, err := overlap(a.Ex, b.Ex)
	if err != nil {
		return eem.Grid{}, fmt.Errorf("the excitations do not overlap (%s, %s)", a.Ex, b.Ex)
	}
	em, err := overlap(a.Em, b.Em)
	if err != nil {
		return eem.Grid{}, fmt.Errorf("the emissions do not overlap (%s, %s)", a.Em, b.Em)
	}
	return eem.Grid{Ex: ex, Em: em}, nil
}

func overlap(a, b eem.Axis) (eem.Axis, error) {
	var nm []float64
	for _, v := range a.Values() {
		if b.Covers(v) {
			nm = append(nm, v)
		}
	}
	return eem.NewAxis(nm)
}

type loadings struct{ ex, em [][]float64 }

// spectraOn gives the loadings of a set on a grid; what is not determined is 0.
func spectraOn(s *unmix.Set, g eem.Grid) loadings {
	var l loadings
	for _, c := range s.OnGrid(g).Components {
		l.ex, l.em = append(l.ex, noNaN(c.Ex)), append(l.em, noNaN(c.Em))
	}
	return l
}

func noNaN(v []float64) []float64 {
	out := make([]float64, len(v))
	for i, x := range v {
		if !math.IsNaN(x) {
			out[i] = x
		}
	}
	return out
}

// peak is the wavelength of the maximum.
func peak(a eem.Axis, v []float64) float64 { return a.At(floats.MaxIdx(v)) }

// relative is |x − y| over the larger of both, 0 where both are 0.
func relative(x, y float64) float64 {
	m := math.Max(math.Abs(x), math.Abs(y))
	if m == 0 {
		return 0
	}
	return math.Abs(x-y) / m
}
