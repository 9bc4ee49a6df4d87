package report

import (
	"fmt"
	"math"
	"strings"

	"benchslip/analyze/compare"
)

// BatchRow is one check over several units in words.
type BatchRow struct {
	Name     string
	Count    string // "7 of 8": passes of those judged or shown
	Mean     string
	Spread   string
	Range    string // "39.91 .. 40.12 dB"
	Limits   string
	Outliers string
}

// BatchRows puts the checks of a summary into words.
func BatchRows(s *compare.Summary) []BatchRow {
	var out []BatchRow
	for i := range s.Checks {
		out = append(out, batchRow(&s.Checks[i]))
	}
	return out
}

func batchRow(b *compare.Batch) BatchRow {
	r := BatchRow{Name: Clean(b.Name), Limits: "none"}
	pass, all := 0, 0
	var scale Scale
	known := false
	lo, hi := math.Inf(1), math.Inf(-1)
	for i, c := range b.Checks {
		if c == nil {
			continue
		}
		all++
		if c.Verdict == "pass" {
			pass++
		}
		if !known && c.Unit == b.Unit {
			scale, known = ScaleOf(c), true
			r.Limits = scale.limits(c)
		}
		if v := b.Values[i].Value; v != nil {
			lo, hi = math.Min(lo, *v), math.Max(hi, *v)
		}
	}
	r.Count = fmt.Sprintf("%d of %d", pass, all)
	if lo <= hi {
		r.Range = with(scale.Number(lo)+" .. "+scale.Number(hi), scale.Unit())
	}
	if g := b.Group; g != nil && g.Mean != nil {
		r.Mean = scale.Value(*g.Mean)
		if g.Spread != nil {
			r.Spread = "0"
			if *g.Spread > 0 {
				r.Spread = scale.Small(*g.Spread)
			}
		}
		r.Outliers = Clean(strings.Join(g.Outliers, ", "))
	}
	return r
}

// UnitLine is one unit in one line.
func UnitLine(u compare.OneUnit) string {
	text := fmt.Sprintf("%s: %s, sheet %s", u.Name, Verdict(u.Verdict), u.Sheet)
	if len(u.Fails) > 0 {
		text += "; fails: " + strings.Join(u.Fails, ", ")
	}
	if len(u.Open) > 0 {
		text += "; open: " + strings.Join(u.Open, ", ")
	}
	return Clean(text)
}
