// Package html writes a slip as one HTML file: the sheet that a person reads,
// prints and attaches. It holds everything it needs: no script, no link out, no
// form; figures are inline SVG. It reads on narrow screens, in light and dark,
// on A4 and Letter, in black and white, and aloud.
//
// The page is laid out in sheet.html and styled in sheet.css; this package
// only gathers what they show.
package html

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"slices"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/report"
	"benchslip/report/figure"
)

//go:embed sheet.html
var page string

//go:embed sheet.css
var style string

var sheet = template.Must(template.New("sheet").Funcs(template.FuncMap{
	"user": user, "lines": userLines, "bdi": user,
}).Parse(page))

// data is what sheet.html shows.
type data struct {
	Style             template.CSS
	Head              report.Head
	Title             string // as typed
	Gate              template.HTML
	VerdictClass      string
	Tool              string
	Unit, Record      []report.Pair
	Rows              []row
	Flags             []report.Flag
	Opinions, Waivers []remark
	Gear              []slip.Gear
	Takes             []take
	Cautions          []string
	Job               slip.Job
	LimitsSHA256      string
	Operator          string
	Approved          string
}

type row struct {
	report.Row
	Class   string // CSS class of the verdict
	Gate    template.HTML
	Strip   template.HTML
	Facts   []string
	Budget  []report.Part
	Pairs   []report.Pair
	Tables  []report.Table
	Figures []fig
	See     []fig // figures that stand at another row
}

type fig struct {
	N, Row  int
	SVG     template.HTML
	Title   string
	Caption string
}

// remark is an opinion or a waiver with its row.
type remark struct {
	N          int
	Name, Text string
}

type take struct {
	*slip.Take
	Facts string
	Where []report.Pair
}

// Render writes the sheet.
func Render(w io.Writer, s *slip.Slip) error {
	d := gather(s)
	var b bytes.Buffer
	if err := sheet.Execute(&b, d); err != nil {
		return fmt.Errorf("html: %w", err)
	}
	_, err := w.Write(squeeze(b.Bytes()))
	return err
}

// squeeze drops the blank lines that the template's own structure leaves. A
// line break inside running text is kept by them: only empty lines go.
func squeeze(page []byte) []byte {
	var out bytes.Buffer
	for _, line := range bytes.Split(page, []byte("\n")) {
		if len(bytes.TrimSpace(line)) > 0 {
			out.Write(bytes.TrimRight(line, " \t"))
			out.WriteByte('\n')
		}
	}
	return out.Bytes()
}

func gather(s *slip.Slip) *data {
	rows := report.Rows(s)
	d := &data{Style: template.CSS(strings.Replace(style, "SHEET", cssWord(s.Sheet), 1)), Head: report.HeadOf(s, rows),
		Title: s.Title, Gate: gate(s.Verdict, 2.2), VerdictClass: verdictClass(s.Verdict), Tool: report.ToolLine(s),
		Unit: report.RawPairs(s.Unit, s.UnitKeys), Record: report.RawPairs(s.Record, s.RecordKeys), Flags: report.Flags(s),
		Gear: s.Gear, Cautions: s.Cautions, Job: s.Job, LimitsSHA256: s.LimitsSHA256,
		Operator: s.Record["operator"], Approved: s.Record["approved"]}
	if strings.TrimSpace(d.Title) == "" {
		d.Title = d.Head.Title
	}
	if d.Operator == "" {
		d.Operator = s.Record["measured"]
	}
	for i := range s.Takes {
		t := &s.Takes[i]
		d.Takes = append(d.Takes, take{t, strings.Join(report.TakeFacts(t), ", "), report.RawPairs(t.Where, t.WhereKeys)})
	}
	figures := report.Figures(s)
	for i := range rows {
		d.Rows = append(d.Rows, newRow(s, &rows[i], figures))
		for _, o := range rows[i].Check.Opinions {
			d.Opinions = append(d.Opinions, remark{i + 1, s.Checks[i].Name, o})
		}
		if rows[i].Waiver != "" {
			d.Waivers = append(d.Waivers, remark{i + 1, s.Checks[i].Name, rows[i].Waiver})
		}
	}
	return d
}

func newRow(s *slip.Slip, r *report.Row, figures []*report.Figure) row {
	out := row{Row: *r, Class: verdictClass(r.Check.Verdict), Gate: gate(r.Check.Verdict, 1), Facts: r.Facts(), Budget: r.Budget()}
	if st := figure.NewStrip(r, s.Rule); st != nil {
		out.Strip = template.HTML(fmt.Sprintf(`<svg class="strip" viewBox="0 0 %g %g" role="img"><title>%s</title>%s</svg>`,
			figure.StripWidth, figure.StripHeight, template.HTMLEscapeString(st.Words), figure.ShapesSVG(st.Shapes())))
	}
	out.Pairs, out.Tables = report.Details(r.Check)
	for _, f := range figures {
		if !slices.Contains(f.Rows, r.N) {
			continue
		}
		g := fig{N: f.N, Row: f.Rows[0], Title: report.Clean(f.Title)}
		if f.Rows[0] != r.N {
			out.See = append(out.See, g)
			continue
		}
		svg, remarks := figure.SVG(f.Figure, fmt.Sprintf("fig%d", f.N), false)
		g.SVG, g.Caption = template.HTML(svg), figure.Caption(f.Figure, remarks)
		out.Figures = append(out.Figures, g)
	}
	return out
}

// Remark reports whether there is more to say of a row than its numbers.
func (r row) Remark() bool {
	return r.Say != "" || r.Advice != "" || r.Waiver != ""
}

// verdictClass names the CSS class that colours a verdict; colour is the last
// of the ways in which it is said.
func verdictClass(v string) string {
	switch v {
	case slip.Pass:
		return "good"
	case slip.Fail:
		return "bad"
	case slip.ConditionalPass, slip.ConditionalFail, slip.Inconclusive:
		return "doubt"
	case slip.NotMeasurable, slip.NotApplicable:
		return "open"
	}
	return "plain"
}

// gate is the sign of a verdict. The verdict stands beside it in words, so it
// is hidden from screen readers; it has a title all the same.
func gate(verdict string, scale float64) template.HTML {
	return template.HTML(fmt.Sprintf(`<svg class="gate" viewBox="0 0 %g %g" width="%g" height="%g" aria-hidden="true"><title>%s</title>%s</svg>`,
		figure.GateWidth, figure.GateHeight, figure.GateWidth*scale, figure.GateHeight*scale,
		template.HTMLEscapeString(report.Verdict(verdict)), figure.ShapesSVG(figure.Gate(verdict))))
}

// cssWord keeps what can stand in a CSS string without harm.
func cssWord(s string) string {
	return strings.Map(func(r rune) rune {
		if r >= '0' && r <= '9' || r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r == '-' {
			return r
		}
		return -1
	}, s)
}
