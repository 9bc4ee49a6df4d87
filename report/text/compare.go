package text

import (
	"io"
	"strconv"
	"strings"

	"benchslip/analyze/compare"
	"benchslip/report"
)

// Compare writes a comparison, the worst row first.
func Compare(w io.Writer, r *compare.Report) error {
	p := &page{}
	p.line("COMPARE  ", r.Headline())
	for _, s := range r.Slips {
		p.line("  ", report.ComparedSource(s))
	}
	rows := report.ComparedRows(r)
	cells := [][]string{{"row", "state", "check", "first", "last", "difference", "margin"}}
	for i, c := range rows {
		cells = append(cells, []string{strconv.Itoa(i + 1), c.State, c.Name, c.Values[0], c.Values[len(c.Values)-1], orDash(c.Difference), orDash(c.Margin)})
	}
	p.WriteString("\n")
	widths := []int{4, 14, 0, 19, 19, 19, 10}
	left := Width - 2*(len(widths)-1)
	for col := range widths {
		most := 0
		for _, row := range cells {
			most = max(most, report.Width(row[col]))
		}
		widths[col] = min(widths[col], most)
		left -= widths[col]
	}
	widths[2] = left
	for i, c := range cells {
		p.cells(c, widths)
		if i == 0 {
			p.WriteString(strings.Repeat("-", Width) + "\n")
			continue
		}
		p.comparedRemarks(&rows[i-1])
	}
	p.line("", "")
	p.line("", report.ComparisonRule)
	_, err := io.WriteString(w, p.String())
	return err
}

func (p *page) comparedRemarks(c *report.Compared) {
	item := func(name, text string) {
		if text != "" {
			p.line("     "+name, text)
		}
	}
	item("why       ", c.Why)
	if c.Mean != "" {
		spread := ""
		if c.Spread != "" {
			spread = ", spread " + c.Spread
		}
		item("all       ", "mean "+c.Mean+spread)
		item("outliers  ", c.Outliers)
		item("trend     ", c.Trend)
	}
}

func orDash(s string) string {
	if s == "" {
		return "-"
	}
	return s
}
