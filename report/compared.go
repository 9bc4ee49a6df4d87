package report

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze/compare"
	"benchslip/analyze/slip"
)

// Compared is one row of a comparison in words and rounded numbers. All texts
// are clean.
type Compared struct {
	Row        *compare.Row
	Name       string
	State      string   // in words
	Values     []string // one a slip: "39.980 ± 0.060 dB", "below 0.0004 %", "missing"
	Difference string   // "-0.012 ± 0.060 dB"; "" where there is none
	Margin     string   // change of the margin; "" without limits
	Why        string
	Mean       string // of three and more slips
	Spread     string
	Outliers   string // labels; "" none
	Trend      string // "0.02 ± 0.01 dB a year, significant"; "" none
}

// ComparedRows puts the rows of a comparison into words, in its order.
func ComparedRows(r *compare.Report) []Compared {
	out := make([]Compared, len(r.Checks))
	for i := range r.Checks {
		out[i] = comparedRow(&r.Checks[i])
	}
	return out
}

func comparedRow(row *compare.Row) Compared {
	c := Compared{Row: row, Name: Clean(row.Name), State: StateWord(row), Why: Clean(row.Why)}
	var scale Scale
	known := false
	for i, k := range row.Checks {
		if k == nil {
			c.Values = append(c.Values, "missing")
			continue
		}
		c.Values = append(c.Values, RowOf(k, i+1, slip.Rule{}).Value)
		if !known && k.Unit == row.Unit {
			scale, known = ScaleOf(k), true
		}
	}
	diff := func(x float64, u *float64) string {
		if u != nil && *u > 0 {
			places := 1 - exponent(scale.convert(*u), 2)
			return with(signed(fixed(scale.convert(x), places))+" ± "+fixed(scale.convert(*u), places), scale.DiffUnit())
		}
		if x == 0 {
			return "0"
		}
		return signed(scale.Small(x))
	}
	if row.Difference != nil {
		c.Difference = diff(*row.Difference, row.Uncertainty)
	}
	if row.Margin != nil {
		c.Margin = signed(scale.Diff(*row.Margin))
		if row.Uncertainty != nil && *row.Uncertainty > 0 {
			c.Margin = signed(with(fixed(scale.convert(*row.Margin), 1-exponent(scale.convert(*row.Uncertainty), 2)), scale.DiffUnit()))
		}
	}
	if g := row.Group; g != nil && g.Mean != nil {
		c.Mean = scale.Value(*g.Mean)
		if g.Spread != nil {
			c.Spread = scale.Small(*g.Spread)
			if *g.Spread == 0 {
				c.Spread = "0"
			}
		}
		c.Outliers = Clean(strings.Join(g.Outliers, ", "))
		if t := g.Trend; t != nil && !math.IsNaN(t.PerYear) {
			c.Trend = diff(t.PerYear, &t.Uncertainty) + " a year"
			if t.Significant {
				c.Trend += ", significant"
			}
		}
	}
	return c
}

func signed(s string) string {
	number, _, _ := strings.Cut(s, " ")
	if s == "" || s[0] == '-' || strings.Trim(number, "0.") == "" {
		return s
	}
	return "+" + s
}

// StateWord says what became of a row.
func StateWord(row *compare.Row) string {
	switch row.State {
	case compare.Worse:
		return "worse"
	case compare.Incomparable:
		return "cannot compare"
	case compare.Changed:
		return "changed"
	case compare.Better:
		return "better"
	}
	return "same"
}

// ComparedSource is a slip of a comparison in one line.
func ComparedSource(s compare.Source) string {
	parts := []string{s.File, "sheet " + s.Sheet}
	if s.Serial != "" && s.Serial != s.Label {
		parts = append(parts, "serial "+s.Serial)
	}
	if s.Date != "" && s.Date != s.Label {
		parts = append(parts, s.Date)
	}
	parts = append(parts, Verdict(s.Verdict))
	return Clean(fmt.Sprintf("%s: %s", s.Label, strings.Join(parts, ", ")))
}

// ComparisonRule says when a difference counts.
const ComparisonRule = "A difference is the last slip less the first. It is significant when it is larger than its expanded uncertainty, " +
	"in which errors that both slips share, such as one calibration of one gear, cancel. A row is worse when its margin to the limits shrank by more than that."
