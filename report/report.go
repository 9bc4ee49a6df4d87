// Package report turns a slip into words and rounded numbers that every
// renderer shares: rows, sentences, counts, flags, budgets. SI prefixes and
// rounding happen here and nowhere else; the slip itself is never changed.
//
// The renderers are in the folders below: text, html, json, csv, junit,
// markdown, pdf; figures are drawn by figure. renderers lists them all and
// builds the files of a slip.
package report

import (
	"fmt"
	"strings"

	"benchslip/analyze/slip"
)

// Verdict returns a verdict in the words of the sheet: "conditional pass".
// An unknown one is returned as it stands.
func Verdict(v string) string {
	switch v {
	case slip.ConditionalPass:
		return "conditional pass"
	case slip.ConditionalFail:
		return "conditional fail"
	case slip.NotMeasurable:
		return "not measurable"
	case slip.NotApplicable:
		return "not applicable"
	case slip.NotJudged:
		return "not judged"
	}
	return Clean(v)
}

// Open reports whether a check's verdict leaves the slip inconclusive.
// Optional rows that do not apply or whose take is missing do not, nor do
// rows that are only shown.
func Open(c *slip.Check) bool {
	switch c.Verdict {
	case slip.ConditionalPass, slip.ConditionalFail:
		return true
	case slip.NotMeasurable, slip.NotApplicable:
		return !setAside(c) && c.Class != info
	}
	return false
}

// info is the class of rows that are shown and never judged.
const info = "info"

func setAside(c *slip.Check) bool {
	code, _ := SplitReason(c.Reason)
	return c.Optional && (c.Verdict == slip.NotApplicable || c.Verdict == slip.NotMeasurable && code == "missing-take")
}

// SplitReason parts a reason into its code and the text behind it. A code is
// one word of small letters and hyphens that a colon follows or that holds a
// hyphen or stands alone; a reason in mere words has none.
func SplitReason(reason string) (code, text string) {
	i := strings.IndexFunc(reason, func(r rune) bool { return !(r == '-' || r >= 'a' && r <= 'z' || r >= '0' && r <= '9') })
	if i < 0 {
		return reason, ""
	}
	code = reason[:i]
	if i == 0 || reason[i] != ':' && !strings.Contains(code, "-") {
		return "", reason
	}
	return code, strings.TrimLeft(reason[i:], " :,;")
}

// classes in the order in which they are counted.
var classes = []string{"critical", "major", "minor", info}

// Tally counts rows by class.
type Tally struct {
	Pass, Fail, Open, Aside, Shown map[string]int // by class; Shown: not judged
	Judged                         map[string]int // rows with a verdict that counts
	Rows                           int
}

// Count tallies the checks of a slip.
func Count(s *slip.Slip) Tally {
	t := Tally{map[string]int{}, map[string]int{}, map[string]int{}, map[string]int{}, map[string]int{}, map[string]int{}, len(s.Checks)}
	for i := range s.Checks {
		c := &s.Checks[i]
		class := classOf(c)
		switch {
		case c.Verdict == slip.NotJudged || class == info:
			t.Shown[class]++
			continue
		case setAside(c):
			t.Aside[class]++
			continue
		case c.Verdict == slip.Pass:
			t.Pass[class]++
		case c.Verdict == slip.Fail:
			t.Fail[class]++
		default:
			t.Open[class]++
		}
		t.Judged[class]++
	}
	return t
}

func classOf(c *slip.Check) string {
	for _, k := range classes {
		if c.Class == k {
			return k
		}
	}
	return "major"
}

func sum(m map[string]int) (n int) {
	for _, k := range classes {
		n += m[k]
	}
	return n
}

// byClass writes "1 major, 2 minor".
func byClass(m map[string]int) string {
	var parts []string
	for _, k := range classes {
		if m[k] > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", m[k], k))
		}
	}
	return strings.Join(parts, ", ")
}

// Counts says what became of the rows by class, in parts to be joined:
// "fails: 1 major, 2 minor", "open: 1 minor", "passes: critical 3 of 3, major 4 of 5".
func (t Tally) Counts() []string {
	var out []string
	if sum(t.Fail) > 0 {
		out = append(out, "fails: "+byClass(t.Fail))
	} else if sum(t.Judged) > 0 {
		out = append(out, "fails: none")
	}
	if sum(t.Open) > 0 {
		out = append(out, "open: "+byClass(t.Open))
	}
	var pass []string
	for _, k := range classes {
		if t.Judged[k] > 0 {
			pass = append(pass, fmt.Sprintf("%s %d of %d", k, t.Pass[k], t.Judged[k]))
		}
	}
	if pass != nil {
		out = append(out, "passes: "+strings.Join(pass, ", "))
	}
	if n := sum(t.Shown); n > 0 {
		out = append(out, fmt.Sprintf("shown, not judged: %d", n))
	}
	if n := sum(t.Aside); n > 0 {
		out = append(out, fmt.Sprintf("optional, set aside: %d", n))
	}
	return out
}
