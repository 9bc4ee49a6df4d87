package report

import (
	"fmt"
	"reflect"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/slip"
)

// Figure is one figure of a slip with its number and the rows that show it.
// Checks that look at the same take often bring the same figure: it is kept
// once.
type Figure struct {
	*analyze.Figure
	N    int    // from 1
	Name string // of its files, without ending: "03-spectrum"
	Rows []int  // first the row it stands at
}

// Figures numbers the figures of a slip in the order of its rows.
func Figures(s *slip.Slip) []*Figure {
	var out []*Figure
	names := map[string]bool{}
	for i := range s.Checks {
	next:
		for k := range s.Checks[i].Figures {
			f := &s.Checks[i].Figures[k]
			for _, g := range out {
				if g.ID == f.ID && g.Title == f.Title && reflect.DeepEqual(g.Figure, f) {
					if g.Rows[len(g.Rows)-1] != i+1 {
						g.Rows = append(g.Rows, i+1)
					}
					continue next
				}
			}
			name := fmt.Sprintf("%02d-%s", i+1, fileSafe(f.ID))
			for n := 2; names[name]; n++ {
				name = fmt.Sprintf("%02d-%s-%d", i+1, fileSafe(f.ID), n)
			}
			names[name] = true
			out = append(out, &Figure{Figure: f, N: len(out) + 1, Name: name, Rows: []int{i + 1}})
		}
	}
	return out
}

// fileSafe keeps small letters, digits and hyphens, at most 40 of them.
func fileSafe(s string) string {
	s = strings.Map(func(r rune) rune {
		switch {
		case r >= 'a' && r <= 'z' || r >= '0' && r <= '9':
			return r
		case r >= 'A' && r <= 'Z':
			return r + 'a' - 'A'
		}
		return '-'
	}, s)
	s = strings.Trim(s, "-")
	if s == "" {
		s = "figure"
	}
	return strings.TrimRight(s[:min(len(s), 40)], "-")
}
