package figure

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze"
	"benchslip/capture/unit"
	"benchslip/report"
)

// Words tells what a figure shows to someone who cannot see it: title, axes
// with their ranges, curves with their extremes, marks with their places,
// lines drawn across.
func Words(f *analyze.Figure) string {
	var out []string
	title := strings.TrimSpace(report.Clean(f.Title))
	if title != "" {
		out = append(out, strings.TrimRight(title, ".")+".")
	}
	y, x := spoken(f.Y), spoken(f.X)
	if y != "" || x != "" {
		out = append(out, capital(fmt.Sprintf("%s against %s%s.", orThing(y), orThing(x), logWord(f.X))))
	}
	for _, s := range f.Series {
		out = append(out, curveWords(s, f))
	}
	for i, m := range f.Marks {
		if i == 12 {
			out = append(out, fmt.Sprintf("%d more marks.", len(f.Marks)-i))
			break
		}
		label := report.Clean(m.Label)
		word := kindOf(m.Kind).word
		if label != "" {
			word += " " + label
		}
		out = append(out, fmt.Sprintf("Marked: %s at %s, %s.", word, quantity(m.X, f.X), quantity(m.Y, f.Y)))
	}
	for _, r := range f.Rules {
		a := f.Y
		if r.Vertical {
			a = f.X
		}
		out = append(out, strings.TrimSpace(fmt.Sprintf("Line across at %s %s", quantity(r.At, a), inBrackets(r.Label)))+".")
	}
	return strings.Join(out, " ")
}

func curveWords(s analyze.Series, f *analyze.Figure) string {
	name := report.Clean(s.Name)
	if name == "" {
		name = "unnamed"
	}
	x0, x1, lo, hi, at, n := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1), 0.0, 0
	for i := range min(len(s.X), len(s.Y)) {
		if !finite(s.X[i]) || !finite(s.Y[i]) {
			continue
		}
		n++
		x0, x1 = math.Min(x0, s.X[i]), math.Max(x1, s.X[i])
		if s.Y[i] > hi {
			hi, at = s.Y[i], s.X[i]
		}
		low := s.Y[i]
		if i < len(s.Low) && finite(s.Low[i]) {
			low = s.Low[i]
		}
		lo = math.Min(lo, low)
	}
	if n == 0 {
		return "Curve " + name + ": no data."
	}
	return fmt.Sprintf("Curve %s: %d points from %s to %s, between %s and %s, largest at %s.", name, n,
		quantity(x0, f.X), quantity(x1, f.X), quantity(lo, f.Y), quantity(hi, f.Y), quantity(at, f.X))
}

func spoken(a analyze.Axis) string {
	s := report.Clean(a.Label)
	if a.Unit != "" {
		s += " in " + report.Clean(a.Unit)
	}
	return s
}

func orThing(s string) string {
	if s == "" {
		return "value"
	}
	return s
}

func capital(s string) string { return strings.ToUpper(s[:1]) + s[1:] }

func logWord(a analyze.Axis) string {
	if a.Log {
		return " (logarithmic)"
	}
	return ""
}

func inBrackets(s string) string {
	if s = report.Clean(s); s == "" {
		return ""
	}
	return "(" + s + ")"
}

func quantity(v float64, a analyze.Axis) string {
	if u, err := unit.Lookup(a.Unit); err == nil {
		return unit.FormatProper(v, u, 0)
	}
	return strings.TrimSpace(report.Digits(v, 4) + " " + report.Clean(a.Unit))
}
