package compare

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"benchslip/analyze/slip"
	"benchslip/capture/unit"
)

// A value holds for its conditions. Those that make another quantity of it
// must be equal in both slips: how the takes were made (`where`), band,
// weighting, frequency, order, reference. What is measured anew each time (the
// level at the input, the gain that noise is referred by, a load's exact
// resistance, the stretch of the take) may differ.

// otherConditions says which condition differs; "" none.
func otherConditions(sa, sb *slip.Slip, a, b *slip.Check) string {
	if why := otherWhere(takeOf(sa, a), takeOf(sb, b)); why != "" {
		return why
	}
	ca, cb := fixed(a.Conditions, takeOf(sa, a)), fixed(b.Conditions, takeOf(sb, b))
	there, here := without(ca, cb), without(cb, ca)
	switch {
	case there == "" && here == "":
		return ""
	case there == "":
		there = "nothing"
	case here == "":
		here = "nothing"
	}
	return fmt.Sprintf("other conditions: %s there, %s here", there, here)
}

// without lists what of x is not in y.
func without(x, y []string) string {
	var out []string
	for _, c := range x {
		if !slices.Contains(y, c) {
			out = append(out, fmt.Sprintf("%q", c))
		}
	}
	return strings.Join(out, ", ")
}

// takeOf is the take that a check reads first; nil for entered readings.
func takeOf(s *slip.Slip, c *slip.Check) *slip.Take {
	if len(c.Takes) == 0 {
		return nil
	}
	for i := range s.Takes {
		if s.Takes[i].Name == c.Takes[0].Name {
			return &s.Takes[i]
		}
	}
	return nil
}

func otherWhere(a, b *slip.Take) string {
	if a == nil || b == nil {
		return ""
	}
	var keys []string
	for _, m := range []map[string]string{a.Where, b.Where} {
		for k := range m {
			if !slices.Contains(keys, k) {
				keys = append(keys, k)
			}
		}
	}
	slices.Sort(keys)
	for _, k := range keys {
		x, inA := a.Where[k]
		y, inB := b.Where[k]
		switch {
		case inA && inB && sameText(x, y):
		case inA && inB:
			return fmt.Sprintf("other conditions: %s = %s there, %s here", k, x, y)
		case inA:
			return fmt.Sprintf("other conditions: %s = %s there, not stated here", k, x)
		default:
			return fmt.Sprintf("other conditions: %s = %s here, not stated there", k, y)
		}
	}
	if a.Setup != b.Setup {
		return fmt.Sprintf("other conditions: setup %q there, %q here", a.Setup, b.Setup)
	}
	return ""
}

// sameText compares quantities by value, all else as text.
func sameText(x, y string) bool {
	if x = strings.TrimSpace(x); x == strings.TrimSpace(y) {
		return true
	}
	p, err1 := unit.Parse(x)
	q, err2 := unit.Parse(y)
	if err1 != nil || err2 != nil || p.Unit.Dim != q.Unit.Dim {
		return false
	}
	return math.Abs(p.Linear()-q.Linear()) <= 1e-9*math.Max(math.Abs(p.Linear()), math.Abs(q.Linear()))
}

// measuredAnew begins phrases that may differ from slip to slip.
var measuredAnew = []string{"span ", "input level ", "gain ", "load ", "series resistor ", "rails ", "temperature ", "length ",
	"out on channel ", "in on channel ", "second out on channel ", "driven on channel ", "mains reference on channel ", "mean of ", "input taken "}

// fixed leaves out of a check's conditions what may differ: what is measured
// anew, which takes they came from, and the take's own `where`, which is
// compared by value.
func fixed(conditions []string, t *slip.Take) []string {
	var out []string
	for _, c := range conditions {
		skip := strings.Contains(c, " take ") || strings.HasPrefix(c, "from ") && strings.Contains(c, " takes: ")
		for _, p := range measuredAnew {
			skip = skip || strings.HasPrefix(c, p) && !strings.HasPrefix(c, "gain taken at")
		}
		if t != nil {
			for k, v := range t.Where {
				skip = skip || c == k+" = "+v
			}
		}
		if !skip {
			out = append(out, c)
		}
	}
	return out
}
