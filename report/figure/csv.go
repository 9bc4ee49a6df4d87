package figure

import (
	"strconv"
	"strings"

	"benchslip/analyze"
	"benchslip/report"
)

// CSV gives the data of a figure in the units of its axes, every point, none
// thinned (RFC 4180: comma, CR LF). Columns: part (the kind of curve, "mark"
// or "rule"), name, x, y, and low for envelopes. A rule leaves the other axis
// empty.
func CSV(f *analyze.Figure) []byte {
	var b strings.Builder
	head := func(a analyze.Axis, fallback string) string {
		s := a.Label
		if s == "" {
			s = fallback
		}
		if a.Unit != "" {
			s += " [" + a.Unit + "]"
		}
		return s
	}
	row := func(cells ...string) {
		for i, c := range cells {
			if i > 0 {
				b.WriteByte(',')
			}
			b.WriteString(report.Cell(c))
		}
		b.WriteString("\r\n")
	}
	row("part", "name", head(f.X, "x"), head(f.Y, "y"), "low")
	for _, s := range f.Series {
		// Names are escaped once a curve, not once a point.
		lead := report.Cell(s.Kind) + "," + report.Cell(s.Name) + ","
		for i := range min(len(s.X), len(s.Y)) {
			b.WriteString(lead)
			b.WriteString(num(s.X[i]))
			b.WriteByte(',')
			b.WriteString(num(s.Y[i]))
			b.WriteByte(',')
			if i < len(s.Low) {
				b.WriteString(num(s.Low[i]))
			}
			b.WriteString("\r\n")
		}
	}
	for _, m := range f.Marks {
		row("mark", strings.TrimSpace(m.Kind+" "+m.Label), num(m.X), num(m.Y), "")
	}
	for _, r := range f.Rules {
		if r.Vertical {
			row("rule", r.Label, num(r.At), "", "")
		} else {
			row("rule", r.Label, "", num(r.At), "")
		}
	}
	return []byte(b.String())
}

// num writes a number to eight significant digits, "" when it is not finite.
func num(v float64) string {
	if !finite(v) {
		return ""
	}
	v, _ = strconv.ParseFloat(strconv.FormatFloat(v, 'e', 7, 64), 64)
	return strconv.FormatFloat(v, 'g', -1, 64)
}
