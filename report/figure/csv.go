package figure

import (
	"math"
	"strconv"
	"strings"

	"benchslip/analyze"
	"benchslip/report"
)

// CSV gives the data that a figure draws, in the units of its axes (RFC 4180:
// comma, CR LF). Columns: part (the kind of curve, "mark" or "rule"), name, x,
// y, and low for envelopes. A curve too long to be drawn point by point is
// given as drawn, by the smallest and largest value of every pixel column, and
// its part says "extremes". A rule leaves the other axis empty.
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
			b.WriteString(c)
		}
		b.WriteString("\r\n")
	}
	row("part", "name", report.Cell(head(f.X, "x")), report.Cell(head(f.Y, "y")), "low")
	point := func(lead string, x, y float64, low string) {
		b.WriteString(lead + num(x) + "," + num(y) + "," + low + "\r\n")
	}
	fr := newFrame(f, Width)
	for i, s := range f.Series {
		// Names are escaped once a curve, not once a point.
		part, name := report.Cell(s.Kind)+",", report.Cell(s.Name)+","
		c := fr.curves[i]
		if !c.thinned {
			for k := range min(len(s.X), len(s.Y)) {
				low := ""
				if k < len(s.Low) {
					low = num(s.Low[k])
				}
				point(part+name, s.X[k], s.Y[k], low)
			}
			continue
		}
		part = report.Cell(s.Kind+" extremes") + ","
		lows := c.cols
		if c.low != nil {
			lows, _ = columns(c.x, c.low, fr.x, fr.columns)
		}
		for k, col := range c.cols {
			if c.low != nil {
				low := math.Min(lows[k].y1, lows[k].y2)
				point(part+name, col.x1/fr.x.factor, math.Max(col.y1, col.y2)/fr.y.factor, num(low/fr.y.factor))
				continue
			}
			point(part+name, col.x1/fr.x.factor, col.y1/fr.y.factor, "")
			if col.n > 1 && (col.x1 != col.x2 || col.y1 != col.y2) {
				point(part+name, col.x2/fr.x.factor, col.y2/fr.y.factor, "")
			}
		}
	}
	for _, m := range f.Marks {
		row("mark", report.Cell(strings.TrimSpace(m.Kind+" "+m.Label)), num(m.X), num(m.Y), "")
	}
	for _, r := range f.Rules {
		if r.Vertical {
			row("rule", report.Cell(r.Label), num(r.At), "", "")
		} else {
			row("rule", report.Cell(r.Label), "", num(r.At), "")
		}
	}
	return []byte(b.String())
}

// num writes a number to seven significant digits, "" when it is not finite.
func num(v float64) string {
	if !finite(v) {
		return ""
	}
	v, _ = strconv.ParseFloat(strconv.FormatFloat(v, 'e', 6, 64), 64)
	return strconv.FormatFloat(v, 'g', -1, 64)
}
