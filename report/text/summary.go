package text

import (
	"io"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// Summary writes what a terminal shows after a run: the head, one line a row
// with why and what would settle it, and what the rows say as opinion.
func Summary(w io.Writer, s *slip.Slip) error {
	p := &page{}
	rows := report.Rows(s)
	p.head(s, report.HeadOf(s, rows))
	p.table(rows)
	p.opinions(rows)
	_, err := io.WriteString(w, p.String())
	return err
}
