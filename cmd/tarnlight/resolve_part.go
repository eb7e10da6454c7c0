package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"slices"

	"gonum.org/v1/gonum/floats"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/parafac"
)

// resolvePart finds components without references, where the settings or the
// verb ask for it.
func (j *job) resolvePart(ctx context.Context) error {
	c := j.set.Resolve.Components
	switch {
	case !j.resolve || (c.Mode == "off" && j.quantify):
		return nil
	case c.Mode == "off":
		return errors.New("the settings say [resolve] components = \"off\"; give a number, a range such as [2, 7], or \"auto\"")
	case c.Mode == "auto" && j.quantify && len(j.res) > 0:
		return nil // the standards answer the question
	}
	fit := j.fitCube()
	if fit.Len() == 0 {
		return errors.New("no usable sample is left to resolve components from")
	}
	set, err := j.parafacSettings(fit.Grid)
	if err != nil {
		return err
	}
	if err := j.choose(ctx, fit, c, set); err != nil {
		return err
	}
	chosen := componentsOf(j.fit)
	j.keepNames(chosen)
	j.fitNotes(chosen)
	return j.resolveWith(chosen, "parafac", nil)
}

// inFit says whether a bottle takes part in the model.
func inFit(b *prepare.Bottle) bool {
	k := b.Row.Kind
	return b.Usable() && b.Row.ExcludeFromFit == "" && (k == survey.Sample || k == survey.Spike)
}

// fitCube stacks the bottles that the model is made of.
func (j *job) fitCube() *eem.Cube {
	var idx []int
	for _, b := range j.sv.Bottles {
		if inFit(b) {
			idx = append(idx, j.row[b])
		}
	}
	return j.cube.Select(idx)
}

// parafacSettings maps the survey's settings.
func (j *job) parafacSettings(g eem.Grid) (*parafac.Settings, error) {
	r := j.set.Resolve
	s := &parafac.Settings{Starts: r.Starts, Seed: r.Seed, Tol: r.Tolerance, RawSamples: !r.ScaleSamples,
		Workers: j.workers, Progress: j.bar.step}
	if r.Hold != "" {
		held, err := readReferences(filepath.Join(j.dir, filepath.FromSlash(r.Hold)), r.Hold)
		if err != nil {
			return nil, err
		}
		for _, c := range held.OnGrid(g).Components {
			if slices.ContainsFunc(append(slices.Clone(c.Ex), c.Em...), math.IsNaN) {
				return nil, fmt.Errorf("settings, resolve.hold: %s knows %q only for %s, the survey was measured on %s; narrow [grid] to what it covers", r.Hold, c.Name, held.Grid, g)
			}
			s.Hold = append(s.Hold, parafac.Held{Name: c.Name, Ex: c.Ex, Em: c.Em})
		}
	}
	return s, nil
}

// componentsOf makes a set of a fit. Its contributions are Fmax.
func componentsOf(r *parafac.Result) *unmix.Set {
	s := &unmix.Set{Grid: r.Grid, Unit: r.Unit, Method: "parafac", Origin: eem.Count(r.Components, "component") + " resolved from " + eem.Count(len(r.IDs), "bottle")}
	for f := range r.Components {
		c := unmix.Component{Name: fmt.Sprintf("C%d", f+1), Scale: 1, Ex: r.Ex[f], Em: r.Em[f],
			ExDetermined: r.ExDetermined[f], EmDetermined: r.EmDetermined[f]}
		if r.ExSE != nil {
			c.ExU, c.EmU = r.ExSE[f], r.EmSE[f]
		}
		if r.Held[f] != "" {
			c.Name = r.Held[f]
		}
		s.Components = append(s.Components, c)
	}
	return s
}

// fitNotes turns what the fit says about itself into flags of the survey.
func (j *job) fitNotes(chosen *unmix.Set) {
	add := func(code string, sev eem.Severity, v, lim float64, msg string) {
		j.flags = append(j.flags, j.sv.Accept(eem.Flag{Method: "parafac", Test: code, Severity: sev, Value: v, Limit: lim, Msg: msg}))
	}
	if j.fit.Status != parafac.Converged {
		add("not-converged", eem.Doubt, j.fit.Certificate, 0.1, fmt.Sprintf("the fit of %s ended as: %s (distance from the optimum %.2g standard errors)", eem.Count(j.fit.Components, "component"), j.fit.Status, j.fit.Certificate))
	}
	agree := 0
	for _, s := range j.fit.Starts {
		if s.Agrees {
			agree++
		}
	}
	if n := len(j.fit.Starts); n > 1 {
		share, lim := float64(agree)/float64(n), j.sv.Limit("starts-disagree")
		if share < lim {
			add("starts-disagree", eem.Remark, share, lim, fmt.Sprintf("%d of %d starts reached the best fit", agree, n))
		}
	}
	for _, n := range j.fit.Notes {
		if n.Test != "" {
			f := eem.FlagFrom(n, "", "")
			f.Method = "parafac"
			j.flags = append(j.flags, j.sv.Accept(f))
		}
	}
	j.peakNotes(chosen, func(c *unmix.Component) bool {
		return !c.ExDetermined[floats.MaxIdx(c.Ex)] || !c.EmDetermined[floats.MaxIdx(c.Em)]
	})
}
