package compare

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// mostCurves keeps a figure readable: the first slip and the next ones.
const mostCurves = 6

// figures lays the curves that slips hold in their details over each other:
// responses, harmonics, hum, CMRR over frequency, distortion over level. The
// same curve under several checks is drawn once.
func figures(r *Report) []analyze.Figure {
	out := []analyze.Figure{}
	seen := map[string]bool{}
	for i := range r.Checks {
		row := &r.Checks[i]
		for _, k := range curves {
			f, ok := overlay(row, r.Slips, k)
			if !ok {
				continue
			}
			print := fmt.Sprint(f.Y, f.Series)
			if seen[print] {
				continue
			}
			seen[print] = true
			f.ID = fmt.Sprintf("%s-%d", k.id, len(out)+1)
			f.Title = fmt.Sprintf("%s: %s", row.Name, k.title)
			out = append(out, f)
		}
	}
	return out
}

// curve says which keys of which list in a check's details make a curve.
type curve struct {
	id, title, list, x, y string
	xAxis, yAxis          analyze.Axis
	kind                  string
	shown                 func(y float64) float64 // nil: as it stands
}

func level(v float64) float64 { return unit.MustLookup("dBu").FromLinear(v) }

var (
	frequency = analyze.Axis{Label: "frequency", Unit: "Hz", Log: true}
	curves    = []curve{
		{"response", "gain over frequency", "points", "frequency_hz", "gain_db", frequency, analyze.Axis{Label: "gain", Unit: "dB"}, analyze.Line, nil},
		{"cmrr", "CMRR over frequency", "points", "frequency_hz", "cmrr_db", frequency, analyze.Axis{Label: "CMRR", Unit: "dB"}, analyze.Points, nil},
		{"level", "THD+N over level", "points", "rms_v", "thdn_percent", analyze.Axis{Label: "level", Unit: "V", Log: true}, analyze.Axis{Label: "THD+N", Unit: "%", Log: true}, analyze.Line, nil},
		{"harmonics", "harmonics", "harmonics", "order", "relative_db", analyze.Axis{Label: "order"}, analyze.Axis{Label: "re fundamental", Unit: "dB"}, analyze.Points, nil},
		{"hum", "mains lines", "harmonics", "order", "rms_v", analyze.Axis{Label: "order of the mains"}, analyze.Axis{Label: "level", Unit: "dBu"}, analyze.Points, level},
	}
)

// overlay draws one kind of curve of a row, one series a slip; false when
// fewer than two slips have it.
func overlay(row *Row, src []Source, k curve) (analyze.Figure, bool) {
	f := analyze.Figure{X: k.xAxis, Y: k.yAxis, Series: []analyze.Series{}}
	if k.id == "hum" && row.Measure != "hum" && row.Measure != "hum_ratio" {
		return f, false
	}
	for i, c := range row.Checks {
		if c == nil || len(f.Series) == mostCurves {
			continue
		}
		s := seriesOf(c, k)
		if len(s.X) < 2 {
			continue
		}
		s.Name = src[i].Label
		f.Series = append(f.Series, s)
	}
	left := len(row.Checks) - len(f.Series)
	if left > 0 && len(f.Series) == mostCurves {
		f.Caption = fmt.Sprintf("the first %d slips; %d more are not drawn", mostCurves, left)
	}
	return f, len(f.Series) > 1
}

// seriesOf reads a list of tables out of a check's details, as decoded from
// JSON. Points that are no finite numbers, or not above 0 on a log axis, are
// left out.
func seriesOf(c *slip.Check, k curve) analyze.Series {
	s := analyze.Series{Kind: k.kind}
	list, _ := c.Details[k.list].([]any)
	for _, item := range list {
		m, _ := item.(map[string]any)
		x, okX := m[k.x].(float64)
		y, okY := m[k.y].(float64)
		if !okX || !okY || k.xAxis.Log && x <= 0 || k.yAxis.Log && y <= 0 {
			continue
		}
		if k.shown != nil {
			y = k.shown(y)
		}
		if math.IsNaN(y) || math.IsInf(y, 0) {
			continue
		}
		s.X, s.Y = append(s.X, x), append(s.Y, y)
	}
	return s
}

// Headline says the outcome in one sentence.
func (r *Report) Headline() string {
	var parts []string
	if r.Worse > 0 {
		parts = append(parts, plural(r.Worse, "row is significantly worse", "rows are significantly worse"))
	} else {
		parts = append(parts, "nothing is significantly worse")
	}
	if r.Open > 0 {
		parts = append(parts, plural(r.Open, "row cannot be compared", "rows cannot be compared"))
	}
	better := 0
	for _, c := range r.Checks {
		if c.State == Better {
			better++
		}
	}
	if better > 0 {
		parts = append(parts, plural(better, "row is better", "rows are better"))
	}
	text := strings.Join(parts, "; ")
	return strings.ToUpper(text[:1]) + text[1:] + "."
}

func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}
