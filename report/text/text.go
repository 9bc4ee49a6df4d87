// Package text writes a slip as plain text, 100 cells wide: results first,
// then what they rest on. It holds no control codes whatever the job's texts
// hold, so it can go to a terminal as well as into slip.txt.
package text

import (
	"fmt"
	"io"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// Width is the longest line, in terminal cells.
const Width = 100

// Render writes the whole text.
func Render(w io.Writer, s *slip.Slip) error {
	p := &page{}
	rows := report.Rows(s)
	head := report.HeadOf(s, rows)
	p.head(s, head)
	p.table(rows)
	p.parts(rows)
	p.flags(s)
	p.opinions(rows)
	p.list("Cautions", s.Cautions)
	p.about(s, head)
	p.takes(s)
	p.foot(s)
	_, err := io.WriteString(w, p.String())
	return err
}

type page struct{ strings.Builder }

// line writes text with a hanging indent: first before the first line, as
// many blanks before the others.
func (p *page) line(first, text string) {
	hang := strings.Repeat(" ", report.Width(first))
	for i, l := range report.Wrap(text, Width-len(hang)) {
		if i > 0 {
			first = hang
		}
		p.WriteString(strings.TrimRight(first+l, " ") + "\n")
	}
}

func (p *page) title(t string) { p.WriteString("\n" + t + "\n") }

func (p *page) head(s *slip.Slip, h report.Head) {
	p.line(strings.ToUpper(h.Verdict)+"  ", h.Title)
	p.line("", h.Lead)
	for _, c := range h.Counts {
		p.line("  ", c)
	}
	if h.Closest != "" {
		p.line("  closest: ", h.Closest)
	}
	if h.Flags != "" {
		p.line("  flags: ", h.Flags)
	}
}

// table writes one line a row, more where a cell wraps, and below an open or
// failing row why, and what would settle it.
func (p *page) table(rows []report.Row) {
	if len(rows) == 0 {
		return
	}
	cells := [][]string{{"row", "verdict", "check", "value", "limits", "margin"}}
	for i := range rows {
		r := &rows[i]
		margin := r.Margin
		if margin == "" {
			margin = "-"
		}
		cells = append(cells, []string{fmt.Sprint(r.N), r.Verdict, r.Name, r.Value, r.Limits, margin})
	}
	widths := fit(cells)
	p.WriteString("\n")
	for i, c := range cells {
		p.cells(c, widths)
		if i == 0 {
			p.WriteString(strings.Repeat("-", Width) + "\n")
			continue
		}
		p.remarks(&rows[i-1], widths[0]+2)
	}
}

func (p *page) remarks(r *report.Row, indent int) {
	in := strings.Repeat(" ", indent)
	if r.Say != "" && r.Check.Verdict == slip.Pass {
		p.line(in+"note    ", r.Say)
	} else if r.Say != "" {
		p.line(in+"why     ", r.Why())
	}
	if r.Wide != "" {
		p.line(in+"range   ", "from "+r.Wide)
	}
	if r.Advice != "" {
		p.line(in+"settle  ", r.Advice)
	}
	if r.By != "" {
		p.line(in+"note    ", r.By)
	}
	if r.Waiver != "" {
		p.line(in+"waiver  ", r.Waiver)
	}
}

// fit gives every column the width of its widest cell, within what it may
// take, and the check's name what is left.
func fit(cells [][]string) []int {
	most := []int{4, 16, 0, 26, 20, 12}
	widths := make([]int, len(most))
	left := Width - 2*(len(most)-1)
	for col := range most {
		for _, row := range cells {
			widths[col] = max(widths[col], min(report.Width(row[col]), most[col]))
		}
		left -= widths[col]
	}
	widths[2] = left
	return widths
}

func (p *page) cells(row []string, widths []int) {
	var cols [][]string
	height := 0
	for i, c := range row {
		cols = append(cols, report.Wrap(c, widths[i]))
		height = max(height, len(cols[i]))
	}
	for y := range height {
		var b strings.Builder
		for i, c := range cols {
			cell := ""
			if y < len(c) {
				cell = c[y]
			}
			pad := strings.Repeat(" ", widths[i]-report.Width(cell))
			switch i {
			case 0:
				cell = pad + cell
			default:
				cell += pad
			}
			b.WriteString(cell)
			if i < len(cols)-1 {
				b.WriteString("  ")
			}
		}
		p.WriteString(strings.TrimRight(b.String(), " ") + "\n")
	}
}

// parts says for every row what it rests on and where its uncertainty comes
// from.
func (p *page) parts(rows []report.Row) {
	if len(rows) == 0 {
		return
	}
	p.title("Row by row: what was measured; the two largest parts of U (standard, share of the variance)")
	for i := range rows {
		r := &rows[i]
		p.line(fmt.Sprintf("%4d  ", r.N), strings.Join(r.Facts(), "; "))
		u := r.TwoLargest()
		if u != "" && r.Cover != "" {
			u += "; " + r.Cover
		}
		if u != "" {
			p.line("      U: ", u)
		}
	}
}

func (p *page) flags(s *slip.Slip) {
	flags := report.Flags(s)
	if len(flags) == 0 {
		return
	}
	p.title("Flags")
	for _, f := range flags {
		where := ""
		if f.Take != "" {
			where = "take " + f.Take
		}
		if f.Place != "" {
			where += ", " + f.Place
		}
		if r := f.RowsText(); r != "" {
			where += " (" + r + ")"
		}
		p.line("  ", strings.TrimLeft(f.Code+"  "+where, " ")+": "+f.Message)
	}
}

func (p *page) opinions(rows []report.Row) {
	titled := false
	for i := range rows {
		for _, o := range rows[i].Check.Opinions {
			if !titled {
				p.title("Opinion, not measurement")
				titled = true
			}
			p.line(fmt.Sprintf("%4d  ", rows[i].N), report.Clean(o))
		}
	}
}

func (p *page) list(title string, items []string) {
	if len(items) == 0 {
		return
	}
	p.title(title)
	for _, i := range items {
		p.line("  - ", report.Clean(i))
	}
}

func (p *page) about(s *slip.Slip, h report.Head) {
	p.title("How it was judged")
	p.line("  ", h.Rule)
	p.line("  ", h.Leaves)
	p.pairs("Unit", s.Unit, s.UnitKeys)
	p.pairs("Record", s.Record, s.RecordKeys)
	if len(s.Gear) > 0 {
		p.title("Gear")
		for _, g := range s.Gear {
			p.line("  ", report.GearLine(g))
		}
	}
}

func (p *page) pairs(title string, m map[string]string, order []string) {
	pairs := report.Pairs(m, order)
	if len(pairs) == 0 {
		return
	}
	p.title(title)
	for _, kv := range pairs {
		p.line("  "+kv.Key+": ", kv.Value)
	}
}

func (p *page) takes(s *slip.Slip) {
	if len(s.Takes) == 0 {
		return
	}
	p.title("Takes")
	for i := range s.Takes {
		t := &s.Takes[i]
		p.line("  ", report.Clean(t.Name)+": "+report.TakeLine(t))
		if where := report.PairsLine(report.Pairs(t.Where, t.WhereKeys)); where != "" {
			p.line("    ", where)
		}
		for _, a := range t.Assumptions {
			p.line("    taken as read: ", report.Clean(a))
		}
		if t.SHA256 != nil {
			p.line("    sha256 ", report.Clean(*t.SHA256))
		}
	}
}

func (p *page) foot(s *slip.Slip) {
	p.WriteString("\n" + strings.Repeat("-", Width) + "\n")
	p.line("", "Test record "+report.Clean(s.Sheet)+" by "+report.ToolLine(s)+". It applies only to the item tested.")
	p.line("job     ", report.Clean(s.Job.File)+" sha256 "+report.Clean(s.Job.SHA256))
	p.line("limits  ", "sha256 "+report.Clean(s.LimitsSHA256))
	p.line("", "End of record "+report.Clean(s.Sheet))
}
