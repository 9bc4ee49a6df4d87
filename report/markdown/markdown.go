// Package markdown writes a slip as slip.md, short enough to paste into a
// ticket: verdict, table, what is open and what would settle it. It keeps to
// headings, tables and lists, which every dialect shares; what people typed is
// escaped, so that it is text everywhere.
package markdown

import (
	"fmt"
	"io"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// Render writes the document.
func Render(w io.Writer, s *slip.Slip) error {
	var b strings.Builder
	rows := report.Rows(s)
	h := report.HeadOf(s, rows)
	fmt.Fprintf(&b, "# %s: %s\n\n**%s** %s.\n", h.Verdict, text(h.Title), h.Lead, text(strings.Join(h.Counts, "; ")))
	if h.Closest != "" {
		fmt.Fprintf(&b, "\nClosest call: %s.\n", text(h.Closest))
	}
	pairs := append(report.Pairs(s.Unit, s.UnitKeys), report.Pairs(s.Record, s.RecordKeys)...)
	if len(pairs) > 0 {
		b.WriteString("\n")
	}
	for _, p := range pairs {
		fmt.Fprintf(&b, "- %s: %s\n", text(p.Key), text(p.Value))
	}
	table(&b, rows)
	remarks(&b, rows)
	section(&b, "Flags", flags(s))
	section(&b, "Opinion, not measurement", opinions(rows))
	fmt.Fprintf(&b, "\n## How it was judged\n\n%s %s\n", text(h.Rule), text(h.Leaves))
	fmt.Fprintf(&b, "\nTest record `%s` by %s; it applies only to the item tested. Job `%s`, SHA-256 `%s`; limits `%s`.\n", code(s.Sheet), text(report.ToolLine(s)),
		code(s.Job.File), code(s.Job.SHA256), code(s.LimitsSHA256))
	_, err := io.WriteString(w, b.String())
	return err
}

func table(b *strings.Builder, rows []report.Row) {
	if len(rows) == 0 {
		return
	}
	b.WriteString("\n| row | verdict | check | value ± U | limits | margin |\n| ---: | --- | --- | --- | --- | ---: |\n")
	for i := range rows {
		r := &rows[i]
		verdict := r.Verdict
		if r.Check.Verdict != slip.Pass && r.Check.Verdict != slip.NotJudged {
			verdict = "**" + verdict + "**"
		}
		value := text(r.Value)
		if r.Wide != "" {
			value += " (from " + text(r.Wide) + ")"
		}
		fmt.Fprintf(b, "| %d | %s | %s | %s | %s | %s |\n", r.N, verdict, text(r.Name), value, text(r.Limits), text(r.Margin))
	}
}

func remarks(b *strings.Builder, rows []report.Row) {
	var out []string
	for i := range rows {
		r := &rows[i]
		var parts []string
		if r.Say != "" {
			parts = append(parts, text(r.Why()))
		}
		if r.Advice != "" {
			parts = append(parts, "to settle it: "+text(r.Advice))
		}
		if r.By != "" {
			parts = append(parts, text(r.By))
		}
		if r.Waiver != "" {
			parts = append(parts, text(r.Waiver))
		}
		if parts != nil {
			out = append(out, fmt.Sprintf("row %d: %s", r.N, strings.Join(parts, "; ")))
		}
	}
	section(b, "Remarks", out)
}

func flags(s *slip.Slip) (out []string) {
	for _, f := range report.Flags(s) {
		where := f.Take
		if f.Place != "" {
			where += ", " + f.Place
		}
		if r := f.RowsText(); r != "" {
			where += " (" + r + ")"
		}
		out = append(out, fmt.Sprintf("`%s` %s: %s", code(f.Code), text(where), text(f.Message)))
	}
	return out
}

func opinions(rows []report.Row) (out []string) {
	for i := range rows {
		for _, o := range rows[i].Check.Opinions {
			out = append(out, fmt.Sprintf("row %d: %s", i+1, text(o)))
		}
	}
	return out
}

func section(b *strings.Builder, title string, items []string) {
	if len(items) == 0 {
		return
	}
	fmt.Fprintf(b, "\n## %s\n\n", title)
	for _, i := range items {
		b.WriteString("- " + i + "\n")
	}
}

// text escapes what a dialect of Markdown could read as markup: CommonMark
// 2.4 lets every ASCII punctuation be escaped by a backslash; < > & and @
// become entities, since some dialects look for tags and names first; the
// beginnings of bare addresses are broken.
func text(s string) string {
	s = strings.TrimSpace(report.Clean(s))
	var b strings.Builder
	for i, r := range s {
		switch {
		case strings.ContainsRune("\\`*_{}[]#|~!^$", r):
			b.WriteByte('\\')
			b.WriteRune(r)
		case r == '<':
			b.WriteString("&lt;")
		case r == '>':
			b.WriteString("&gt;")
		case r == '&':
			b.WriteString("&amp;")
		case r == '@':
			b.WriteString("&#64;")
		case r == ':' && strings.HasPrefix(s[i:], "://"):
			b.WriteString("&#58;")
		case r == '.' && i >= 3 && strings.EqualFold(s[i-3:i], "www"):
			b.WriteString("&#46;")
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// code prepares text for a code span, where nothing can be escaped.
func code(s string) string {
	s = strings.ReplaceAll(report.Clean(s), "`", "'")
	if strings.TrimSpace(s) == "" {
		return "-"
	}
	return s
}
