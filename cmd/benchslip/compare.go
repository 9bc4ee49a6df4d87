package main

import (
	"bytes"
	"io"
	"path/filepath"

	"github.com/spf13/cobra"

	"benchslip/analyze/compare"
	"benchslip/report/csv"
	"benchslip/report/html"
	"benchslip/report/json"
	"benchslip/report/text"
)

// Statuses of compare and recheck; exitFault as everywhere.
const (
	exitWorse = 1 // compare: a row is significantly worse; recheck: the slip differs
	exitOpen  = 3 // compare: rows cannot be compared
)

func (a *app) compareCommand() *cobra.Command {
	var asJSON bool
	var page, table string
	cmd := &cobra.Command{
		Use:   "compare SLIP.json SLIP.json...",
		Short: "hold slips against each other: before and after, unit against unit",
		Long: `Compares finished slips, each with the first: differences with their uncertainty,
what is significant, the worst first. Three and more slips give mean, spread,
outliers and, where they have dates, a trend.

Exit status: 0 nothing is significantly worse (no margin shrank by more than its
uncertainty), 1 something is, 3 nothing is worse but rows cannot be compared
(missing, another measure, other conditions), 2 a slip could not be read.`,
		Example: "benchslip compare before/slip.json after/slip.json --html compare.html",
		Args:    files("slip"),
	}
	f := cmd.Flags()
	f.SortFlags = false
	f.BoolVar(&asJSON, "json", false, "print it for a program instead")
	f.StringVar(&page, "html", "", "write a page with the curves over each other into `FILE`")
	f.StringVar(&table, "csv", "", "write a table into `FILE`")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if len(args) < 2 {
			return usagef("compare: wants two slips or more, got %d; see benchslip compare --help", len(args))
		}
		var in []compare.Input
		for _, path := range args {
			s, _, err := compare.Read(path)
			if err != nil {
				return err
			}
			in = append(in, compare.Input{File: filepath.ToSlash(path), Slip: s})
		}
		r, err := compare.Make(in)
		if err != nil {
			return err
		}
		for _, out := range []struct {
			path  string
			write func(io.Writer, *compare.Report) error
		}{{page, html.Compare}, {table, csv.Compare}} {
			if out.path == "" {
				continue
			}
			if err := notOver(out.path, args...); err != nil {
				return err
			}
			var b bytes.Buffer
			if err := out.write(&b, r); err != nil {
				return err
			}
			if err := writeFile(out.path, b.Bytes()); err != nil {
				return err
			}
		}
		switch {
		case r.Worse > 0:
			a.status = exitWorse
		case r.Open > 0:
			a.status = exitOpen
		}
		if asJSON {
			a.raw = true
			return json.Write(&a.out, r)
		}
		return text.Compare(&a.out, r)
	}
	return cmd
}
