package html

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"

	"benchslip/analyze/compare"
	"benchslip/report"
)

//go:embed units.html
var unitsPage string

var unitsSheet = template.Must(template.New("units").Funcs(template.FuncMap{
	"user": user, "bdi": user, "verdict": report.Verdict, "class": verdictClass,
}).Parse(unitsPage))

// Summary writes the summary of several units as a page, by the rules of the
// sheet.
func Summary(w io.Writer, s *compare.Summary) error {
	title := s.Title
	if title == "" {
		title = s.Job
	}
	d := struct {
		*compare.Summary
		Style   template.CSS
		Heading string
		Rows    []report.BatchRow
	}{s, pageStyle("Summary"), title, report.BatchRows(s)}
	var b bytes.Buffer
	if err := unitsSheet.Execute(&b, d); err != nil {
		return fmt.Errorf("html: %w", err)
	}
	_, err := w.Write(squeeze(b.Bytes()))
	return err
}
