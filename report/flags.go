package report

import (
	"strconv"
	"strings"

	"benchslip/analyze/slip"
)

// Flag is a flag of a slip once, with the rows that carry it.
type Flag struct {
	Code, Take, Message string
	Place               string // "channel 1, 0.5 s .. 0.75 s"; "" the whole take
	Rows                []int
}

// Flags collects the flags of takes and checks, each once, in the order in
// which they are met: takes first.
func Flags(s *slip.Slip) []Flag {
	var out []Flag
	at := map[string]int{}
	put := func(f slip.Flag, take string, row int) {
		if f.Take != "" {
			take = f.Take
		}
		g := Flag{Code: Clean(f.Code), Take: Clean(take), Message: Clean(f.Message), Place: Place(f)}
		key := strings.Join([]string{g.Code, g.Take, g.Message, g.Place}, "\x00")
		i, seen := at[key]
		if !seen {
			i = len(out)
			at[key] = i
			out = append(out, g)
		}
		if n := len(out[i].Rows); row > 0 && (n == 0 || out[i].Rows[n-1] != row) {
			out[i].Rows = append(out[i].Rows, row)
		}
	}
	for _, t := range s.Takes {
		for _, f := range t.Flags {
			put(f, t.Name, 0)
		}
	}
	for i, c := range s.Checks {
		for _, f := range c.Flags {
			take := ""
			if c.Take != nil {
				take = *c.Take
			}
			put(f, take, i+1)
		}
	}
	return out
}

// RowsText is "row 3", "rows 3, 4" or "".
func (f Flag) RowsText() string {
	if len(f.Rows) == 0 {
		return ""
	}
	var n []string
	for _, r := range f.Rows {
		n = append(n, strconv.Itoa(r))
	}
	return rowList(n)
}

// Place says where in a take a flag points; "" for the whole of it.
func Place(f slip.Flag) string {
	var parts []string
	if f.Channel != nil {
		parts = append(parts, "channel "+strconv.Itoa(*f.Channel))
	}
	switch {
	case f.FromS != nil && f.ToS != nil && *f.FromS != *f.ToS:
		parts = append(parts, plain(*f.FromS)+" s .. "+plain(*f.ToS)+" s")
	case f.FromS != nil:
		parts = append(parts, "at "+plain(*f.FromS)+" s")
	case f.ToS != nil:
		parts = append(parts, "up to "+plain(*f.ToS)+" s")
	}
	return strings.Join(parts, ", ")
}
