package html

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"strings"

	"benchslip/analyze/plan"
	"benchslip/report/text"
)

//go:embed plan.html
var planPage string

//go:embed page.css
var more string

var planSheet = template.Must(template.New("plan").Funcs(template.FuncMap{
	"user": user, "lines": userLines, "join": func(list []string) string { return strings.Join(list, ", ") },
	"recording": func(t plan.Take) string { return text.Recording(&t) }, "span": func(t plan.Take) string { return text.Span(&t) },
	"inc": func(i int) int { return i + 1 },
}).Parse(planPage))

// Plan writes a plan as a page to print and take to the bench, by the rules of
// the sheet: one file, nothing fetched, user text shut into elements of its
// own.
func Plan(w io.Writer, p *plan.Plan) error {
	title := p.Title
	if strings.TrimSpace(title) == "" {
		title = p.Job
	}
	d := struct {
		*plan.Plan
		Style    template.CSS
		Heading  string
		Progress string
	}{p, pageStyle("Plan"), title, text.Progress(p)}
	var b bytes.Buffer
	if err := planSheet.Execute(&b, d); err != nil {
		return fmt.Errorf("html: %w", err)
	}
	_, err := w.Write(squeeze(b.Bytes()))
	return err
}

// pageStyle is the style of the sheet with other words at the foot of printed
// pages, and what the other pages need besides.
func pageStyle(foot string) template.CSS {
	return template.CSS(strings.Replace(style, "Test record SHEET", cssWord(foot), 1) + more)
}
