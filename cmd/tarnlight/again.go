package main

import (
	"context"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"tarnlight/eem/survey"
	"tarnlight/unmix/outdir"
	"tarnlight/unmix/report"
)

// newReportCmd makes workbook, page and pictures again.
func newReportCmd(s streams) *cobra.Command {
	c := &cobra.Command{
		Use:   "report OUT",
		Short: "Makes workbook, page and pictures again from results",
		Long: `report makes report.xlsx, report.html, maps and figures again from the tables and
survey.nc of a results folder, for example after the [report] settings of its
settings-used.toml were completed. No number changes.`,
		Example: "  tarnlight report mysurvey/out",
		Args:    cobra.ExactArgs(1),
		RunE:    func(c *cobra.Command, args []string) error { return runReport(c.Context(), s, args[0]) },
	}
	return c
}

func runReport(ctx context.Context, s streams, dir string) error {
	if err := resultsFolder(dir); err != nil {
		return err
	}
	old, err := outdir.ReadProvenance(dir)
	if err != nil {
		return err
	}
	set, err := survey.ReadSettings(filepath.Join(dir, "settings-used.toml"))
	if err != nil {
		return err
	}
	stage, err := outdir.Begin(dir)
	if err != nil {
		return err
	}
	defer stage.Abort() //nolint:errcheck // after Commit it does nothing
	if err := copyResults(dir, stage); err != nil {
		return err
	}
	b := newBar(s.err)
	if err := report.Render(ctx, stageDir(stage), renderSettings(set), b.step); err != nil {
		return err
	}
	old.Outputs = nil
	if err := stage.Commit(old); err != nil {
		return err
	}
	fmt.Fprintf(s.err, "made again: %s\n", filepath.Join(dir, "report.html"))
	return nil
}

// copyResults stages everything that Render does not make.
func copyResults(dir string, stage *outdir.Staging) error {
	return filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		rel, err := filepath.Rel(dir, path)
		if err != nil {
			return err
		}
		name := filepath.ToSlash(rel)
		if d.IsDir() {
			if name == "maps" || name == "figures" {
				return filepath.SkipDir
			}
			return nil
		}
		if name == "provenance.json" || strings.HasPrefix(name, "report.") || name == "workings.xlsx" {
			return nil
		}
		data, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		return os.WriteFile(stage.Path(name), data, 0o644)
	})
}

// renderSettings maps the survey's settings.
func renderSettings(s *survey.Settings) report.RenderSettings {
	r := s.Report
	return report.RenderSettings{Title: s.Title, Client: r.Client, Order: r.Order, Number: r.Number, Method: r.Method, Remarks: r.Remarks,
		TestedBy: r.TestedBy, ApprovedBy: r.ApprovedBy, Decimal: map[string]string{"comma": ",", "point": "."}[r.Decimal], Digits: r.Digits,
		Pictures: r.Pictures != "none", Accepts: s.Quality.Accept, SafeName: survey.SafeName}
}

func (j *job) renderSettings() report.RenderSettings { return renderSettings(j.set) }

// newVerifyCmd says whether results can be trusted.
func newVerifyCmd(s streams) *cobra.Command {
	var from string
	c := &cobra.Command{
		Use:   "verify OUT",
		Short: "After: can this be trusted? Results whole, inputs there and equal, inputs gone",
		Long: `verify holds every file of a results folder and every raw file it rests on against
the hashes that were written with the results. It needs nothing but the folders.

Exit codes: 0 results whole and inputs equal, 1 results missing or changed, 3 results
whole but an input is gone or another than it was.`,
		Example: "  tarnlight verify mysurvey/out\n  tarnlight verify results --survey mysurvey",
		Args:    cobra.ExactArgs(1),
		RunE:    func(_ *cobra.Command, args []string) error { return runVerify(s, args[0], from) },
	}
	c.Flags().StringVar(&from, "survey", "", "survey folder (default: the folder that holds OUT)")
	return c
}

// runVerify exits 1 where the results are not what was written, 3 where an input
// is gone or another.
func runVerify(s streams, dir, from string) error {
	if err := resultsFolder(dir); err != nil {
		return err
	}
	r, err := verifyFrom(dir, from)
	if err != nil {
		return err
	}
	for _, line := range r.Lines() {
		if _, err := fmt.Fprintln(s.out, line); err != nil {
			return err
		}
	}
	if n := len(r.InputsMissing); from == "" && n > 0 && n == len(r.Provenance.Inputs) {
		fmt.Fprintf(s.err, "not one input lies where it was; where the survey is not the folder that holds the results: tarnlight verify %s --survey DIR\n", dir)
	}
	switch {
	case !r.Whole():
		return &codeError{code: exitFailed}
	case !r.InputsEqual():
		return &codeError{code: exitDoubt}
	}
	return nil
}

// verifyFrom verifies results of the survey folder from; empty: the one that holds
// them.
func verifyFrom(dir, from string) (outdir.Report, error) {
	if from == "" {
		return outdir.Verify(dir)
	}
	if err := surveyFolder(from); err != nil {
		return outdir.Report{}, err
	}
	return outdir.VerifyWith(dir, from)
}
