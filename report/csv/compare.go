package csv

import (
	"io"
	"strconv"
	"strings"

	"benchslip/analyze/compare"
	"benchslip/report"
)

// Compare writes a comparison as a table: one row a check, the worst first,
// three columns a slip at the end, which carry its label.
func Compare(w io.Writer, r *compare.Report) error {
	var b strings.Builder
	line := func(cells []string) {
		b.WriteString(strings.Join(cells, ","))
		b.WriteString("\r\n")
	}
	head := []string{"name", "measure", "unit", "state", "difference", "uncertainty", "significant", "margin_change", "why",
		"count", "mean", "spread", "median", "outliers", "trend_per_year", "trend_uncertainty", "trend_significant"}
	for _, s := range r.Slips {
		for _, what := range []string{"value", "uncertainty", "verdict"} {
			head = append(head, report.Cell(what+" "+s.Label))
		}
	}
	line(head)
	for _, c := range r.Checks {
		row := []string{report.Cell(c.Name), report.Cell(c.Measure), report.Cell(c.Unit), c.State, number(c.Difference), number(c.Uncertainty),
			strconv.FormatBool(c.Significant), number(c.Margin), report.Cell(c.Why)}
		row = append(row, groupCells(c.Group)...)
		for _, v := range c.Values {
			row = append(row, number(v.Value), number(v.Uncertainty), report.Cell(v.Verdict))
		}
		line(row)
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func groupCells(g *compare.Group) []string {
	if g == nil {
		return make([]string, 8)
	}
	out := []string{strconv.Itoa(g.Count), number(g.Mean), number(g.Spread), number(g.Median), report.Cell(strings.Join(g.Outliers, " ")), "", "", ""}
	if t := g.Trend; t != nil {
		out[5], out[6], out[7] = number(&t.PerYear), number(&t.Uncertainty), strconv.FormatBool(t.Significant)
	}
	return out
}
