package main

import (
	"encoding/json"
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"tarnlight/eem"
	"tarnlight/eem/survey"
)

// newSettingsCmd lists every setting.
func newSettingsCmd(s streams) *cobra.Command {
	var list, asJSON bool
	c := &cobra.Command{
		Use:     "settings --list",
		Short:   "Every key of survey.toml with its default and the reason",
		Example: "  tarnlight settings --list",
		Args:    cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			if asJSON {
				return printJSON(s.out, survey.Keys())
			}
			table := "\x00"
			for _, k := range survey.Keys() {
				if k.Table != table {
					table = k.Table
					if table != "" {
						fmt.Fprintf(s.out, "\n[%s]\n", table)
					}
				}
				if _, err := fmt.Fprintf(s.out, "%s = %s\n    %s. %s\n", k.Name, k.Default, k.Type, k.Reason); err != nil {
					return err
				}
			}
			return nil
		},
	}
	c.Flags().BoolVar(&list, "list", true, "list the keys (the only thing this verb does)")
	c.Flags().BoolVar(&asJSON, "json", false, "as JSON")
	return c
}

// newTestsCmd lists every test code.
func newTestsCmd(s streams) *cobra.Command {
	var list, asJSON bool
	c := &cobra.Command{
		Use:     "tests --list",
		Short:   "Every test code with severity, default limit and source",
		Example: "  tarnlight tests --list",
		Args:    cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			if asJSON {
				type row struct {
					Code, Severity, Unit, What, Source string
					Limit                              float64
				}
				var rows []row
				for _, t := range eem.Tests {
					rows = append(rows, row{t.Code, t.Severity.String(), t.Unit, t.What, t.Source, t.Limit})
				}
				return printJSON(s.out, rows)
			}
			t := newText("test", "severity", "limit", "what it finds", "source of the limit")
			for _, x := range eem.Tests {
				limit := ""
				if x.Limit != 0 {
					limit = short(x.Limit)
					if x.Unit != "" {
						limit += " " + x.Unit
					}
				}
				t.add(x.Code, x.Severity.String(), limit, x.What, x.Source)
			}
			return t.print(s.out)
		},
	}
	c.Flags().BoolVar(&list, "list", true, "list the tests (the only thing this verb does)")
	c.Flags().BoolVar(&asJSON, "json", false, "as JSON")
	return c
}

func printJSON(w io.Writer, v any) error {
	b, err := json.MarshalIndent(v, "", "  ")
	if err != nil {
		return err
	}
	_, err = fmt.Fprintln(w, string(b))
	return err
}
