// Package csv writes the rows of a slip as slip.csv, for spreadsheets and
// scripts: RFC 4180 with CR LF, one header row, every row of one width,
// decimal points, empty fields where nothing is known. Numbers are those of
// slip.json; text that a spreadsheet would run as a formula gets an apostrophe
// before it.
package csv

import (
	"io"
	"math"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// Header names the columns. They may grow at the end; none is renamed.
var Header = []string{"row", "name", "measure", "class", "clause", "takes", "verdict", "value", "uncertainty",
	"interval_low", "interval_high", "coverage", "bound", "bound_value", "unit", "min", "max", "typical", "margin",
	"probability", "reason", "advice", "flags", "unstated", "waiver", "entered", "sheet"}

// Render writes the table.
func Render(w io.Writer, s *slip.Slip) error {
	var b strings.Builder
	line := func(cells []string) {
		b.WriteString(strings.Join(cells, ","))
		b.WriteString("\r\n")
	}
	line(Header)
	for _, r := range report.Rows(s) {
		line(cells(&r, s))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func cells(r *report.Row, s *slip.Slip) []string {
	c := r.Check
	low, high, kind, bound := "", "", "", ""
	if c.Interval != nil {
		low, high = number(&c.Interval[0]), number(&c.Interval[1])
	}
	if c.Bound != nil {
		kind, bound = report.Cell(c.Bound.Kind), number(&c.Bound.Value)
	}
	var codes []string
	for _, f := range c.Flags {
		codes = append(codes, f.Code)
	}
	return []string{strconv.Itoa(r.N), report.Cell(c.Name), report.Cell(c.Measure), report.Cell(c.Class), report.Cell(c.Clause),
		report.Cell(r.Takes()), report.Cell(c.Verdict), number(c.Value), number(c.Uncertainty), low, high, number(c.Coverage),
		kind, bound, report.Cell(c.Unit), number(c.Min), number(c.Max), number(c.Typical), number(c.Margin),
		number(c.Probability), report.Cell(c.Reason), report.Cell(c.Advice), report.Cell(strings.Join(codes, " ")),
		report.Cell(strings.Join(c.Unstated, " ")), report.Cell(r.Waiver), report.Cell(r.By), report.Cell(s.Sheet)}
}

func number(x *float64) string {
	if x == nil || math.IsNaN(*x) || math.IsInf(*x, 0) {
		return ""
	}
	return report.Number(*x)
}
