package main

import (
	"context"

	"tarnlight/eem"
	"tarnlight/eem/survey"
	"tarnlight/unmix/parafac"
	"tarnlight/unmix/report"
)

// choose fits every number of components asked for and takes the stated one, or
// the largest that converged with half of its starts agreeing.
func (j *job) choose(ctx context.Context, fit *eem.Cube, c survey.Components, set *parafac.Settings) error {
	for n := c.From; n <= min(c.To, fit.Len()); n++ {
		r, err := parafac.Fit(ctx, fit, n, set)
		if err != nil {
			return err
		}
		j.fits = append(j.fits, r)
		agree := 0
		for _, s := range r.Starts {
			if s.Agrees {
				agree++
			}
		}
		if n == j.set.Resolve.Choose || j.fit == nil || (j.set.Resolve.Choose == 0 && r.Status == parafac.Converged && 2*agree >= len(r.Starts)) {
			j.fit = r
		}
	}
	return nil
}

// splitTable makes splits.csv.
func (j *job) splitTable() *report.Table { return report.New("splits.csv") }

// splitSpectra makes split_spectra.csv.
func (j *job) splitSpectra() *report.Table { return report.New("split_spectra.csv") }
