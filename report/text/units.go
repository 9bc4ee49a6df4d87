package text

import (
	"fmt"
	"io"
	"strings"

	"benchslip/analyze/compare"
	"benchslip/report"
)

// Units writes the summary of several units: each unit's verdict, then mean,
// spread and outliers of every check.
func Units(w io.Writer, s *compare.Summary) error {
	p := &page{}
	title := report.Clean(s.Title)
	if title == "" {
		title = report.Clean(s.Job)
	}
	p.line(strings.ToUpper(report.Verdict(s.Verdict))+"  ", fmt.Sprintf("%s, %d units", title, len(s.Units)))
	p.WriteString("\n")
	for _, u := range s.Units {
		p.line("  ", report.UnitLine(u))
	}
	p.WriteString("\n")
	cells := [][]string{{"row", "check", "units", "mean", "spread", "lowest .. highest"}}
	rows := report.BatchRows(s)
	for i, r := range rows {
		cells = append(cells, []string{fmt.Sprint(i + 1), r.Name, r.Count, orDash(r.Mean), orDash(r.Spread), orDash(r.Range)})
	}
	widths := []int{4, 0, 8, 16, 12, 26}
	left := Width - 2*(len(widths)-1)
	for col := range widths {
		most := 0
		for _, row := range cells {
			most = max(most, report.Width(row[col]))
		}
		widths[col] = min(widths[col], most)
		left -= widths[col]
	}
	widths[1] = left
	for i, c := range cells {
		p.cells(c, widths)
		if i == 0 {
			p.WriteString(strings.Repeat("-", Width) + "\n")
		} else if rows[i-1].Outliers != "" {
			p.line("      outliers  ", rows[i-1].Outliers)
		}
	}
	_, err := io.WriteString(w, p.String())
	return err
}
