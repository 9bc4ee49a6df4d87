// Package junit writes a slip as JUnit XML, so that a build server can show
// it: one case a check, in order.
//
//	pass, not-judged                          a plain case
//	fail                                      a case with a failure
//	conditional, not measurable, not applicable   a skipped case
//
// An open row is neither good nor bad there, which is why the suite carries
// the slip's own verdict as a property. Messages stay under 500 characters;
// there are no times, since the same slip must give the same bytes.
package junit

import (
	"encoding/xml"
	"io"
	"strconv"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/report"
)

// MaxMessage is the longest message, in bytes.
const MaxMessage = 499

type suites struct {
	XMLName xml.Name `xml:"testsuites"`
	Suite   suite    `xml:"testsuite"`
}

type suite struct {
	Name       string     `xml:"name,attr"`
	Tests      int        `xml:"tests,attr"`
	Failures   int        `xml:"failures,attr"`
	Errors     int        `xml:"errors,attr"`
	Skipped    int        `xml:"skipped,attr"`
	Properties []property `xml:"properties>property"`
	Cases      []testcase `xml:"testcase"`
}

type property struct {
	Name  string `xml:"name,attr"`
	Value string `xml:"value,attr"`
}

type testcase struct {
	Name    string   `xml:"name,attr"`
	Class   string   `xml:"classname,attr"`
	Failure *outcome `xml:"failure"`
	Skipped *outcome `xml:"skipped"`
	Note    string   `xml:"system-out,omitempty"`
}

type outcome struct {
	Message string `xml:"message,attr"`
	Type    string `xml:"type,attr,omitempty"`
}

// Render writes the document.
func Render(w io.Writer, s *slip.Slip) error {
	rows := report.Rows(s)
	out := suite{Name: report.Title(s), Tests: len(rows), Properties: []property{
		{"verdict", report.Clean(s.Verdict)}, {"sheet", report.Clean(s.Sheet)}, {"tool", report.ToolLine(s)},
		{"job_sha256", report.Clean(s.Job.SHA256)}, {"limits_sha256", report.Clean(s.LimitsSHA256)},
		{"rule", report.Clean(s.Rule.Decision)}, {"coverage", report.Number(s.Rule.Coverage)},
	}}
	for i := range rows {
		r := &rows[i]
		c := testcase{Name: r.Name, Class: report.Clean(r.Check.Class + "." + r.Check.Measure), Note: r.By}
		if c.Name == "" {
			c.Name = "row " + strconv.Itoa(r.N)
		}
		switch r.Check.Verdict {
		case slip.Pass, slip.NotJudged:
		case slip.Fail:
			c.Failure = &outcome{message(r), slip.Fail}
			out.Failures++
		default:
			c.Skipped = &outcome{Message: message(r)}
			out.Skipped++
		}
		out.Cases = append(out.Cases, c)
	}
	b, err := xml.MarshalIndent(suites{Suite: out}, "", " ")
	if err != nil {
		return err
	}
	_, err = io.WriteString(w, xml.Header+string(b)+"\n")
	return err
}

// message says verdict, value, limits and why in one line.
func message(r *report.Row) string {
	parts := []string{r.Verdict + ": " + r.Value, "limits " + r.Limits}
	if r.Margin != "" {
		parts = append(parts, "margin "+r.Margin)
	}
	if r.Say != "" {
		parts = append(parts, r.Why())
	}
	if r.Advice != "" {
		parts = append(parts, "to settle it: "+r.Advice)
	}
	if r.Waiver != "" {
		parts = append(parts, r.Waiver)
	}
	m := strings.Join(parts, "; ")
	if len(m) > MaxMessage {
		m = strings.ToValidUTF8(m[:MaxMessage-3], "") + "…"
	}
	return m
}
