package main

import (
	"fmt"
	"slices"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
	"tarnlight/eem/survey"
	"tarnlight/unmix"
	"tarnlight/unmix/merit"
)

// unknowns looks for components that the model lacks in the bottles that should be
// like it.
func (j *job) unknowns(judged *merit.Judged, r *unmix.Resolution, bottles []merit.Bottle, src *merit.Sources, model string) error {
	if j.applied != nil {
		return nil // a bottle scored on a fixed model has nothing to do with the others
	}
	var rows []int
	for _, b := range bottles {
		own := j.bottle(b.ID)
		if b.Row >= 0 && !b.Unlike && len(b.Rejects) == 0 && own.Row.Kind != survey.Standard && own.Row.ExcludeFromFit == "" && !bent(own) {
			rows = append(rows, b.Row)
		}
	}
	judged.Searched = len(rows)
	us, err := merit.FindUnknowns(j.cube, r, rows, src, judged.Spreads)
	if err != nil {
		return err
	}
	for _, u := range us {
		fmt.Fprintf(j.bar, "%s: in %s there is something that the model does not know, at %s\n", r.Set.Method, eem.Count(len(u.Shown), "bottle"), u.Place())
	}
	judged.AddUnknowns(us, r, bottles, j.sv.Accept, model)
	return nil
}

// bent says whether a bottle's inner filter was not, or not well, corrected: its
// spectra have another shape, which is no unknown component.
func bent(b *prepare.Bottle) bool {
	return slices.ContainsFunc(b.Flags, func(f eem.Flag) bool {
		return f.Test == "no-absorbance" || f.Test == "absorbance-limit" || f.Test == "absorbance-range"
	})
}
