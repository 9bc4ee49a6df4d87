package judge

import (
	"fmt"
	"strings"

	"benchslip/analyze"
	"benchslip/analyze/slip"
)

// Classes in the order in which they are counted.
var Classes = []string{"critical", "major", "minor"}

// open reports whether a check keeps the slip from a plain verdict. An
// optional check may be not applicable or want a take.
func open(c *slip.Check) bool {
	if c.Class == Info {
		return false
	}
	switch c.Verdict {
	case slip.ConditionalPass, slip.ConditionalFail:
		return true
	case slip.NotApplicable:
		return !c.Optional
	case slip.NotMeasurable:
		return !(c.Optional && strings.HasPrefix(c.Reason, analyze.MissingTake))
	}
	return false
}

// Overall is the verdict of a slip: fail if any check fails, else inconclusive
// if any is open, else pass; not-judged when nothing was judged.
func Overall(checks []slip.Check) string {
	passes, opens := false, false
	for i := range checks {
		c := &checks[i]
		switch {
		case c.Verdict == slip.Fail && c.Class != Info:
			return slip.Fail
		case open(c):
			opens = true
		case c.Verdict == slip.Pass && c.Class != Info:
			passes = true
		}
	}
	switch {
	case opens:
		return slip.Inconclusive
	case passes:
		return slip.Pass
	}
	return slip.NotJudged
}

// Exit is the exit status of an overall verdict: 1 fails, 3 is open, else 0.
func Exit(verdict string) int {
	switch verdict {
	case slip.Fail:
		return 1
	case slip.Inconclusive:
		return 3
	}
	return 0
}

// Worse is the worse of two exit statuses: 2 before 1 before 3 before 0.
func Worse(a, b int) int {
	for _, s := range []int{2, 1, 3} {
		if a == s || b == s {
			return s
		}
	}
	return 0
}

// Count is how the checks of a class came out; rows that were not judged, of
// class info or optional and absent, are not in it.
type Count struct {
	Class                    string
	Pass, Fail, Open, Judged int
}

// Counts are in the order of Classes, each class present.
func Counts(checks []slip.Check) []Count {
	out := make([]Count, len(Classes))
	for i, name := range Classes {
		out[i].Class = name
		for j := range checks {
			c := &checks[j]
			if c.Class != name && !(c.Class == "" && name == "major") {
				continue
			}
			switch {
			case c.Verdict == slip.Fail:
				out[i].Fail++
			case open(c):
				out[i].Open++
			case c.Verdict == slip.Pass:
				out[i].Pass++
			default:
				continue
			}
			out[i].Judged++
		}
	}
	return out
}

// Headline says the counts in words: "fails: 1 major, 2 minor; open: 1 minor;
// critical 3 of 3 pass".
func Headline(checks []slip.Check) string {
	var fails, opens, passes []string
	for _, n := range Counts(checks) {
		if n.Fail > 0 {
			fails = append(fails, fmt.Sprintf("%d %s", n.Fail, n.Class))
		}
		if n.Open > 0 {
			opens = append(opens, fmt.Sprintf("%d %s", n.Open, n.Class))
		}
		if n.Judged > 0 && (n.Pass > 0 || n.Class == "critical") {
			passes = append(passes, fmt.Sprintf("%s %d of %d pass", n.Class, n.Pass, n.Judged))
		}
	}
	var parts []string
	if fails != nil {
		parts = append(parts, "fails: "+strings.Join(fails, ", "))
	}
	if opens != nil {
		parts = append(parts, "open: "+strings.Join(opens, ", "))
	}
	if passes != nil {
		parts = append(parts, strings.Join(passes, ", "))
	}
	if parts == nil {
		return "nothing was judged: no limits were set"
	}
	return strings.Join(parts, "; ")
}

// Sentence states the decision rule in one sentence, for the head of a sheet.
func Sentence(r slip.Rule) string {
	k := r.Coverage
	if k <= 0 {
		k = 2
	}
	u := fmt.Sprintf("U is the expanded uncertainty with k = %g", k)
	switch r.Decision {
	case Simple:
		return "Simple acceptance: a value on or within its limit passes, whatever its uncertainty; " + u + "."
	case Guarded:
		return "Guarded acceptance: a value passes only when it lies within its limit by its uncertainty U or more, else it fails; " + u + "."
	}
	return "Four verdicts: beyond its limit by its uncertainty U or more a value passes or fails; nearer it passes or fails conditionally; " + u + "."
}
