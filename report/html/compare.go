package html

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"

	"benchslip/analyze/compare"
	"benchslip/report"
	"benchslip/report/figure"
)

//go:embed compare.html
var comparePage string

var compareSheet = template.Must(template.New("compare").Funcs(template.FuncMap{"user": user, "bdi": user}).Parse(comparePage))

// Compare writes a comparison as a page, by the rules of the sheet.
func Compare(w io.Writer, r *compare.Report) error {
	type drawn struct {
		N              int
		SVG            template.HTML
		Title, Caption string
	}
	type row struct {
		report.Compared
		Class string
	}
	d := struct {
		Style            template.CSS
		Headline, Rule   string
		Lines            []string
		Slips            []compare.Source
		Rows             []row
		Figures          []drawn
		Group            bool
		VerdictClass     string
		Count, WorseRows int
	}{Style: pageStyle("Comparison"), Headline: r.Headline(), Rule: report.ComparisonRule, Slips: r.Slips, Group: len(r.Slips) > 2,
		VerdictClass: "good", Count: len(r.Slips), WorseRows: r.Worse}
	switch {
	case r.Worse > 0:
		d.VerdictClass = "bad"
	case r.Open > 0:
		d.VerdictClass = "doubt"
	}
	for _, s := range r.Slips {
		d.Lines = append(d.Lines, report.ComparedSource(s))
	}
	for _, c := range report.ComparedRows(r) {
		d.Rows = append(d.Rows, row{c, stateClass(c.Row.State)})
	}
	for i := range r.Figures {
		f := &r.Figures[i]
		svg, remarks := figure.SVG(f, fmt.Sprintf("fig%d", i+1), false)
		d.Figures = append(d.Figures, drawn{i + 1, template.HTML(svg), report.Clean(f.Title), figure.Caption(f, remarks)})
	}
	var b bytes.Buffer
	if err := compareSheet.Execute(&b, d); err != nil {
		return fmt.Errorf("html: %w", err)
	}
	_, err := w.Write(squeeze(b.Bytes()))
	return err
}

func stateClass(state string) string {
	switch state {
	case compare.Worse:
		return "bad"
	case compare.Incomparable:
		return "open"
	case compare.Changed:
		return "doubt"
	case compare.Better:
		return "good"
	}
	return "plain"
}
